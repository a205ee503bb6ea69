"""The page where people read it: in a browser, on a phone, on paper."""

import base64

import pytest

ROWS = (
    "[...document.querySelectorAll('table.plan tbody tr')].filter(r => !r.hidden)"
    ".map(r => r.cells[0].textContent.slice(14, 16)).join(' ')"
)


def click(what: str) -> str:
    return f"document.querySelector('{what}').click()"


def sort_by(head: str) -> str:
    return f"[...document.querySelectorAll('table.plan thead button')].find(b => b.textContent === '{head}').click()"


def test_page_opens_without_an_error_and_asks_nobody_for_anything(shown):
    browser = shown()
    loud = [
        event
        for event in browser.events
        if event.get("method") in ("Runtime.exceptionThrown", "Runtime.consoleAPICalled", "Log.entryAdded")
    ]
    assert loud == []
    asked = [
        event["params"]["request"]["url"]
        for event in browser.events
        if event.get("method") == "Network.requestWillBeSent"
    ]
    assert [url for url in asked if not url.startswith(("file:", "data:"))] == []


def test_title_is_text_and_no_script(shown):
    browser = shown()
    title = browser.run("document.title")
    assert title.startswith('<script>document.title = "broken"</script>')
    assert browser.run("document.querySelector('h1').textContent") in title
    assert browser.run("document.querySelectorAll('script').length") == 1
    assert browser.run("document.querySelectorAll('img[src=x], b').length") == 0


def test_every_image_is_shown_and_has_a_text(shown):
    browser = shown()
    images = browser.run(
        "Promise.all([...document.querySelectorAll('figure img')].map(async i => {"
        " await i.decode(); return [i.naturalWidth, i.clientWidth, i.alt.length]; }))"
    )
    assert len(images) == 3
    assert all(pixels > 100 and width > 100 and words > 20 for pixels, width, words in images)


def test_table_sorts_by_figures_and_words_with_gaps_last(shown):
    browser = shown()
    assert browser.run(ROWS) == "00 01 02 03"
    browser.run(sort_by("Tangent altitude (km)"))
    assert browser.run(ROWS) == "01 03 00 02"
    browser.run(sort_by("Tangent altitude (km)"))
    assert browser.run(ROWS) == "00 03 01 02"
    assert browser.run("document.querySelector('th[aria-sort]').getAttribute('aria-sort')") == "descending"
    browser.run(sort_by("na_d2 (kR)"))
    assert browser.run(ROWS) == "00 03 01 02"
    browser.run(sort_by("Time"))
    assert browser.run(ROWS) == "00 01 02 03"


def test_table_filters_by_words_and_by_what_may_be_commanded(shown):
    browser = shown()
    browser.run(click("#allowed"))
    assert browser.run(ROWS) == "00 01 02"
    browser.run(
        "const f = document.getElementById('filter'); f.value = 'THICK'; f.dispatchEvent(new Event('input'))"
    )
    assert browser.run(ROWS) == "01"
    assert browser.run("document.getElementById('shown').textContent") == "1 of 4 exposures shown"


def test_times_stay_in_sight_while_the_table_scrolls_sideways(shown):
    browser = shown(700)
    left = "document.querySelector('table.plan tbody th').getBoundingClientRect().left"
    before = browser.run(left)
    scrolled = (
        "(() => { const r = document.querySelector('.tall'); r.scrollLeft = 150; return r.scrollLeft; })()"
    )
    assert browser.run(scrolled) > 50
    assert browser.run(left) == pytest.approx(before, abs=1)
    # Over the cells that pass below it, in the head too.
    assert browser.run("getComputedStyle(document.querySelector('table.plan tbody th')).backgroundColor") != (
        "rgba(0, 0, 0, 0)"
    )


@pytest.mark.parametrize("width", [375, 320])
def test_phone_needs_no_sideways_scrolling_and_gets_narrow_figures(shown, width):
    browser = shown(width, 812)
    assert browser.run("document.documentElement.scrollWidth") == width
    # 88 mm at 50 pixels an inch, where the wide ones have 354.
    assert browser.run("[...document.querySelectorAll('figure img')].every(i => i.currentSrc !== i.src)")


def test_figure_opens_by_keyboard_grows_and_closes(shown):
    browser = shown()
    browser.run("document.querySelector('button.zoom').focus()")
    enter = {"key": "Enter", "code": "Enter", "windowsVirtualKeyCode": 13, "text": "\r"}
    browser.ask("Input.dispatchKeyEvent", type="keyDown", **enter)
    browser.ask("Input.dispatchKeyEvent", type="keyUp", **enter)
    before = browser.run(
        "new Promise(done => setTimeout(() => done([document.getElementById('viewer').open,"
        " document.querySelector('#viewer img').width, document.querySelector('#viewer img').alt.length]), 100))"
    )
    assert before[0]
    assert before[2] > 20
    browser.ask("Input.dispatchKeyEvent", type="keyDown", key="+", text="+")
    assert browser.run("document.querySelector('#viewer img').width") == pytest.approx(1.5 * before[1], abs=1)
    escape = {"key": "Escape", "code": "Escape", "windowsVirtualKeyCode": 27}
    browser.ask("Input.dispatchKeyEvent", type="keyDown", **escape)
    assert not browser.run("document.getElementById('viewer').open")
    assert browser.run("document.activeElement.className") == "zoom"


def test_page_prints(shown):
    browser = shown()
    paper = base64.b64decode(browser.ask("Page.printToPDF", printBackground=True)["data"])
    assert paper.startswith(b"%PDF")
    # Figures, tables and the run file take several sheets.
    assert paper.count(b"/Type /Page\n") + paper.count(b"/Type/Page\n") + paper.count(b"/Type /Page ") > 3
    browser.ask("Emulation.setEmulatedMedia", media="print")
    hidden = "['nav', '.tools', '#viewer'].every(s => getComputedStyle(document.querySelector(s)).display === 'none')"
    assert browser.run(hidden)
    for cut in ("pre", ".tall"):
        assert browser.run(f"getComputedStyle(document.querySelector('{cut}')).maxHeight") == "none"
        assert browser.run(f"getComputedStyle(document.querySelector('{cut}')).overflowY") == "visible"
    browser.ask("Emulation.setEmulatedMedia", media="")
