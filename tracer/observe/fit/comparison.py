"""Products against a measured profile: rates, law parameters, how sure they are, and what cannot be told."""

import math
from collections.abc import Sequence
from difflib import get_close_matches

import numpy as np
import xarray as xr
from numpy.typing import NDArray
from scipy.special import gammaincc

from tracer.errors import InputError
from tracer.observe.fit.calibration import SEED, Calibration
from tracer.observe.fit.curves import Curve, Fixed, Lawful, Parameter
from tracer.observe.fit.fitting import Fitted, fit
from tracer.observe.fit.gathering import Optics, gather, variables_for
from tracer.observe.fit.images import image_of
from tracer.observe.fit.likelihood import Component, Likelihood, Measured, Model, Slot, slots_of
from tracer.observe.fit.pooling import check_alike, with_own_names
from tracer.observe.fit.profile import SI_VALUES, Profile, read_profile
from tracer.observe.fit.result import Comparison, Estimate, Points, RangeEnds, as_read
from tracer.observe.fit.sky import Scale, aperture_of, metres_in, spread_of, track_of, view_of
from tracer.observe.fit.sources import Source
from tracer.observe.fit.words import (
    at_range,
    correlations_of,
    entangled_parameters,
    loud_model,
    quality,
    range_words,
    thickness,
    told_apart,
    unit_slip,
)
from tracer.observe.observationspec.fit import LAW_PARAMETERS, PARAMETERS, ReleaseFit, is_fitted, values
from tracer.observe.observationspec.observation import ObservationSpec
from tracer.units import Quantity, conversion_factor, parse, quoted, si

Floats = NDArray[np.float64]

CAUTION = (
    "Ranges count the profile's errors and the model's own alone. An absolute rate hangs on g-values, "
    "photo-lifetimes and the calibration of the profile as well, which are often known to tens of per cent."
)
POSITION_WORDS = {
    "downtail": "Distance from the body's centre away from the Sun, in the sky",
    "altitude": "Tangent altitude",
    "slit": "Position along the slit",
}


def compare(products: xr.Dataset | Sequence[xr.Dataset], observation: ObservationSpec) -> Comparison:
    """Return what a measured profile says about the sources of products.

    Parameters
    ----------
    products : xarray.Dataset or sequence of them
        Products with replicates, as `tracer.open_product` or `tracer.run` gives them; the releases of several are
        pooled, which must agree in body, sun and gas.
    observation : ObservationSpec
        From `load_observation` or `parse_observation`.

    Returns
    -------
    Comparison
        `rates` [s-1] and law `parameters` with ranges of 68.27 and 95 %, chi-square, correlations, the `points` of
        profile and model, and in words what fits, what cannot be told apart and what is doubtful.

    Raises
    ------
    InputError
        An observation or product that cannot be used.
    """
    several = [products] if isinstance(products, xr.Dataset) else list(products)
    return compared([(f"product {i}", ds) for i, ds in enumerate(several, 1)], observation)


def compared(products: Sequence[tuple[str, xr.Dataset]], spec: ObservationSpec) -> Comparison:
    """Return what `compare` does, of products with names."""
    profile = read_profile(spec)
    for name, ds in products:
        if "body_radius" not in ds.attrs or "release_name" not in ds:
            raise InputError(f"{name}: is no product of tracer run")
    warnings = check_alike(products)
    sources: list[Source] = []
    how: list[str] = []
    for name, ds in products:
        optics = optics_for(spec, profile, ds)
        try:
            found = gather(ds, name, spec.profile.line, optics, wants_responses(spec))
        except InputError as error:
            raise InputError(f"{name}: {error}") from None
        sources += found.sources
        how.append(found.how)
        warnings += [f"{name}: {words}" for words in found.warnings]
    components = components_of(spec, with_own_names(sources))
    data = measured_of(spec, profile)
    slots = slots_of(data, components, spec.background.fitted)
    _check_enough(spec, profile, slots)
    named = with_own_names(sources)
    chosen = [next(one for one in named if one.name == part.name) for part in components]
    slip = unit_slip(
        spec.profile.quantity,
        (data.value - data.level)[~data.upper],
        data.sigma[~data.upper],
        np.sum([one.rate * one.mean for one in chosen], axis=0)[~data.upper],
    )
    for one in chosen:
        if not one.mean.any():
            raise InputError(
                f'{one.product}: release "{one.name}" adds nothing to any point; leave it out of fit.releases'
            )
    fitted = fit(data, components, slots)
    rates = fitted.scan.likelihood.model(fitted.best).rates
    thick = thickness(np.nansum([rate * one.depth for rate, one in zip(rates, chosen, strict=True)], axis=0))
    words = [*([slip] if slip else []), *([thick] if thick else []), *warnings]
    return _result(spec, profile, [name for name, _ in products], how, fitted, words)


def needed_of(ds: xr.Dataset, spec: ObservationSpec, profile: Profile) -> list[str]:
    """Return the names of the variables of a product that `compare` reads, so that nothing else need come into memory.

    Raises
    ------
    InputError
        No image of the view holds the profile.
    """
    optics = optics_for(spec, profile, ds)
    found = image_of(ds, optics.view, optics.image, optics.track)
    return variables_for(ds, spec.profile.line, None if found is None else found.name, wants_responses(spec))


def wants_responses(spec: ObservationSpec) -> bool:
    """Return whether anything but rates is asked of a release."""
    return any(_law_words(entry) for entry in spec.fit.release)


def optics_for(spec: ObservationSpec, profile: Profile, ds: xr.Dataset) -> Optics:
    """Return how a profile is seen on the body of a product.

    Raises
    ------
    InputError
        With the observation file's name and key.
    """
    distance = None if spec.view.distance is None else si(spec.view.distance)
    scale = Scale(float(ds.attrs["body_radius"]), distance, spec.file)
    view = view_of(spec.view)
    positions = profile.position * metres_in(profile.position_unit, scale)
    track = track_of(spec, view, scale, positions)
    aperture, spread = aperture_of(spec.slit, scale, track.angle), spread_of(spec, scale)
    return Optics(view, track, aperture, spread, spec.view.image)


def measured_of(spec: ObservationSpec, profile: Profile) -> Measured:
    """Return the points of a profile as the likelihood takes them.

    Raises
    ------
    InputError
        A background of another kind than the profile.
    """
    level, given = 0.0, spec.background.level
    if given is not None:
        factor = conversion_factor(given.unit, SI_VALUES[spec.profile.quantity])
        if factor is None:
            raise InputError(
                f'{spec.file}: background.level: "{given}" is no {spec.profile.quantity}, which the profile is'
            )
        level = given.value * factor
    return Measured(profile.value, profile.sigma, profile.upper, level)


def components_of(spec: ObservationSpec, sources: Sequence[Source]) -> list[Component]:
    """Return the sources that the observation file asks for, each with what is free in it.

    Raises
    ------
    InputError
        Unknown releases, parameters that a law does not have, or laws that the responses do not cover.
    """
    known = [one.name for one in sources]
    wanted = known if spec.fit.releases is None else list(spec.fit.releases)
    for place, names in (
        ("fit.releases", wanted),
        ("fit.release.name", [one.name for one in spec.fit.release]),
    ):
        for name in names:
            if name not in known:
                close = get_close_matches(name, known, n=1)
                hint = f'did you mean "{close[0]}"?' if close else "allowed: " + ", ".join(map(quoted, known))
                raise InputError(
                    f"{spec.file}: {place}: {quoted(name)} is no release of the products; {hint}"
                )
    entries = {one.name: (number, one) for number, one in enumerate(spec.fit.release, 1)}
    for name, (number, _) in entries.items():
        if name not in wanted:
            raise InputError(f'{spec.file}: fit.release[{number}].name: "{name}" is not among fit.releases')
    made = []
    for source in sources:
        if source.name in wanted:
            number, entry = entries.get(source.name, (0, ReleaseFit(name=source.name)))
            try:
                made.append(_component(source, entry))
            except InputError as error:
                raise InputError(f"{spec.file}: fit.release[{number}]: {error}") from None
    if (
        all(one.held_rate is not None and not one.curve.parameters for one in made)
        and not spec.background.fitted
    ):
        raise InputError(f"{spec.file}: fit: nothing is free; leave a rate free")
    return made


def _component(source: Source, entry: ReleaseFit) -> Component:
    held = None
    if entry.rate == "product":
        held = source.rate
    elif isinstance(entry.rate, Quantity):
        held = si(entry.rate)
    return Component(source.name, _curve(source, entry), source.batches, held)


def _curve(source: Source, entry: ReleaseFit) -> Curve:
    if not _law_words(entry):
        return Fixed(source.mean, source.replicates)
    assert source.response is not None
    law = str(source.speed.get("law")) if entry.law is None else entry.law
    if law not in LAW_PARAMETERS:
        raise InputError(
            f'the run\'s law "{law}" has no parameter to fit; name another with law = "maxwell-flux"'
        )
    held: dict[str, float] = {}
    fitted: list[Parameter] = []
    for key in PARAMETERS:
        given = getattr(entry, key)
        if key not in LAW_PARAMETERS[law]:
            if given is not None:
                raise InputError(f'{key}: is no parameter of law "{law}"')
        elif is_fitted(given):
            fitted.append(Parameter(key, *values(given)))
        else:
            held[key] = values(given)[0] if given is not None else _of_run(source, key)
    return Lawful(source.response, law, held, tuple(fitted))


def _of_run(source: Source, key: str) -> float:
    try:
        return si(parse(source.speed.get(key), "temperature" if key == "temperature" else "energy"))
    except ValueError:
        raise InputError(f"{key}: missing; the run does not state it as one value") from None


def _law_words(entry: ReleaseFit) -> bool:
    return entry.law is not None or any(getattr(entry, key) is not None for key in PARAMETERS)


def _check_enough(spec: ObservationSpec, profile: Profile, slots: Sequence[Slot]) -> None:
    points = int((~profile.upper).sum())
    if points <= len(slots):
        raise InputError(
            f"{spec.folder / spec.profile.file}: {points} measured points for {len(slots)} free parameters "
            f"({', '.join(slot.name for slot in slots)}); there must be more points"
        )


def _result(
    spec: ObservationSpec,
    profile: Profile,
    products: Sequence[str],
    how: Sequence[str],
    fitted: Fitted,
    warnings: Sequence[str],
) -> Comparison:
    likelihood, best = fitted.scan.likelihood, fitted.best
    model, slots = likelihood.model(best), likelihood.slots
    chi_square = likelihood.chi_square(best)
    degrees = int((~profile.upper).sum()) - len(slots)
    probability = float(gammaincc(0.5 * degrees, 0.5 * chi_square))
    labels = [slot.name for slot in slots]
    correlations = correlations_of(fitted.scan, labels)
    names = [one.name for one in likelihood.components]
    by_slot = list(zip(slots, fitted.ranges, strict=True))
    parameters, at_ends = _parameters(by_slot, names)
    points = _points(spec, profile, likelihood, model)
    loud = loud_model(np.sqrt(np.diag(likelihood.model_covariance)), profile.sigma)
    background = next((estimate for slot, estimate in by_slot if slot.component is None), None)
    free = {n: names[s.component] for n, s in enumerate(slots) if s.key is None and s.component is not None}
    factor = 1.0 / profile.value_factor
    return Comparison(
        title=spec.title,
        products=tuple(products),
        what=spec.profile.quantity + (f" of {spec.profile.line}" if spec.profile.line else " density"),
        view=f"seen {view_of(spec.view).words}, by {' and '.join(dict.fromkeys(how))}",
        rates={name: fitted.ranges[n] for n, name in free.items()},
        held_rates={one.name: one.held_rate for one in likelihood.components if one.held_rate is not None},
        parameters=parameters,
        background=None if background is None else Estimate(*(factor * end for end in background)),
        chi_square=chi_square,
        degrees_of_freedom=degrees,
        probability=probability,
        minus_two_log_likelihood=fitted.scan.value,
        range_ends=_range_ends(fitted.calibration, labels),
        correlations=correlations,
        points=points,
        statements=(
            quality(chi_square, degrees, probability),
            range_words(fitted.calibration, labels),
            *told_apart(fitted.absences, correlations, free),
            *entangled_parameters(correlations),
        ),
        warnings=(*warnings, *at_ends, *([loud] if loud else [])),
    )


def _parameters(
    by_slot: Sequence[tuple[Slot, Estimate]], names: Sequence[str]
) -> tuple[dict[str, dict[str, Estimate]], list[str]]:
    """Return the parameters of laws by the component's name and their own, and warnings of those that meet an end."""
    parameters: dict[str, dict[str, Estimate]] = {}
    warnings = []
    for slot, estimate in by_slot:
        if slot.key is None or slot.component is None:
            continue
        parameters.setdefault(names[slot.component], {})[slot.key] = estimate
        read, unit = as_read(slot.key, estimate)
        low, high = (end * read.best / estimate.best for end in (math.exp(slot.low), math.exp(slot.high)))
        found = at_range(f"'{slot.name}'", read, low, high, unit)
        warnings += [found] if found else []
    return parameters, warnings


def _range_ends(calibration: Calibration, names: Sequence[str]) -> RangeEnds:
    rises = {
        name: ((float(low68), float(high68)), (float(low95), float(high95)))
        for name, ((low68, high68), (low95, high95)) in zip(names, calibration.rises, strict=True)
    }
    return RangeEnds(calibration.draws, SEED, rises)


def _points(spec: ObservationSpec, profile: Profile, likelihood: Likelihood, model: Model) -> Points:
    factor = 1.0 / profile.value_factor
    return Points(
        position=profile.position,
        value=profile.value * factor,
        sigma=profile.sigma * factor,
        upper=profile.upper,
        model=model.total * factor,
        model_error=np.sqrt(np.diag(likelihood.model_covariance)) * factor,
        residual=(profile.value - model.total) / likelihood.total_sigma,
        parts={one.name: part * factor for one, part in zip(likelihood.components, model.parts, strict=True)},
        background=model.background * factor,
        unit=profile.value_unit,
        position_unit=profile.position_unit,
        position_words=POSITION_WORDS[spec.profile.along],
    )
