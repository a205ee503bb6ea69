"use strict";
(() => {
  // Planning table: sort by the buttons in its head, filter by words and by what may be commanded.
  const plan = document.querySelector("table.plan");
  if (plan) {
    const body = plan.tBodies[0];
    const rows = [...body.rows];
    const heads = [...plan.tHead.rows[0].cells];
    const words = document.getElementById("filter");
    const allowed = document.getElementById("allowed");
    const told = document.getElementById("shown");
    const collator = new Intl.Collator("en", { numeric: true });

    const key = (row, column) => {
      const cell = row.cells[column];
      return cell.dataset.value === undefined ? cell.textContent : Number(cell.dataset.value);
    };
    const compare = (a, b) => {
      if (typeof a === "string" || typeof b === "string") return collator.compare(String(a), String(b));
      return a - b;
    };
    const sort = (column) => {
      const head = heads[column];
      const falling = head.getAttribute("aria-sort") === "ascending";
      for (const one of heads) one.removeAttribute("aria-sort");
      head.setAttribute("aria-sort", falling ? "descending" : "ascending");
      const keyed = rows.map((row) => [key(row, column), row]);
      // What is no number stands last either way.
      const missing = (one) => typeof one[0] === "number" && Number.isNaN(one[0]);
      const known = keyed.filter((one) => !missing(one)).sort((a, b) => compare(a[0], b[0]) * (falling ? -1 : 1));
      body.append(...[...known, ...keyed.filter(missing)].map((one) => one[1]));
    };
    const filter = () => {
      const wanted = words.value.toLowerCase().split(/\s+/).filter(Boolean);
      let shown = 0;
      for (const row of rows) {
        const text = row.textContent.toLowerCase();
        const hidden = wanted.some((word) => !text.includes(word)) || (allowed.checked && row.classList.contains("forbidden"));
        row.hidden = hidden;
        shown += hidden ? 0 : 1;
      }
      told.textContent = `${shown} of ${rows.length} exposures shown`;
    };
    heads.forEach((head, column) => head.querySelector("button").addEventListener("click", () => sort(column)));
    words.addEventListener("input", filter);
    allowed.addEventListener("change", filter);
    filter();
  }

  // Figures: a button opens one in a window of its own, where it can be enlarged.
  const dialog = document.getElementById("viewer");
  const image = dialog.querySelector("img");
  const name = dialog.querySelector("p");
  const stage = dialog.querySelector(".stage");
  let scale = 1;
  const show = (wanted) => {
    scale = Math.min(8, Math.max(0.25, wanted));
    image.width = Math.round(Math.min(stage.clientWidth, image.naturalWidth) * scale);
  };
  for (const button of document.querySelectorAll("button.zoom")) {
    button.addEventListener("click", () => {
      const source = button.querySelector("img");
      image.src = source.src;
      image.alt = source.alt;
      name.textContent = button.closest("figure").querySelector("h3").textContent;
      dialog.showModal();
      image.decode().then(() => show(1), () => show(1));
    });
  }
  dialog.querySelector(".nearer").addEventListener("click", () => show(scale * 1.5));
  dialog.querySelector(".farther").addEventListener("click", () => show(scale / 1.5));
  dialog.querySelector(".fit").addEventListener("click", () => show(1));
  dialog.querySelector(".close").addEventListener("click", () => dialog.close());
  dialog.addEventListener("keydown", (event) => {
    if (event.ctrlKey || event.altKey || event.metaKey) return;
    const step = { "+": 1.5, "=": 1.5, "-": 1 / 1.5 }[event.key];
    if (step) show(scale * step);
    else if (event.key === "0") show(1);
    else return;
    event.preventDefault();
  });
  image.addEventListener("click", () => show(scale > 1 ? 1 : 2));
})();
