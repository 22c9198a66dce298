"""Wavefronts: every term against published magnitudes, closed forms and a general astronomy library."""

from __future__ import annotations

from decimal import Decimal, getcontext

import numpy as np
import pytest

import tscale
from tscale import exact
from tscale.constants import AU_M, C_M_S, SUN_RADIUS_M
from tscale.ephemeris.shipped import shipped_path
from tscale.link.delay import Ray, gravity
from tscale.transforms.wavefront import observer_state, wavefront_terms

SITE = tscale.Site.from_itrf("north", 1_200_000.0, -4_600_000.0, 4_230_000.0)
YEAR_S = 31557600.0


def source_toward(vector: np.ndarray, **more: float) -> tscale.Source:
    x, y, z = vector / np.linalg.norm(vector)
    return tscale.Source(np.degrees(np.arctan2(y, x)), np.degrees(np.arcsin(z)), **more)


def one(text: str) -> tscale.exact.Pair:
    return tscale.Instants.from_iso(text, scale="TDB").pair


def days(start: str, count: int, step_s: int = 86400) -> tscale.exact.Pair:
    whole, fraction = one(start)
    return whole + step_s * np.arange(count), np.full(count, fraction)


@pytest.mark.parametrize(("longitude_deg", "latitude_deg"), [(0.0, 0.0), (137.0, 0.0), (72.0, 30.0)])
def test_annual_amplitude_of_the_roemer_delay(
    reference: tscale.ReferenceData, longitude_deg: float, latitude_deg: float
) -> None:
    # 1 au / c = 499.004784 s (IAU 2012 B2) times cos(ecliptic latitude). The amplitude of the annual term of an
    # ellipse is that of the circle to e^2 = 3e-4, and twelve years average the pull of Jupiter: 0.15 s.
    obliquity = np.radians(84381.406 / 3600)  # IAU 2006
    along, b = np.radians([longitude_deg, latitude_deg])
    x, y, z = np.cos(b) * np.cos(along), np.cos(b) * np.sin(along), np.sin(b)
    c, s = np.cos(obliquity), np.sin(obliquity)
    source = source_toward(np.array([x, c * y - s * z, s * y + c * z]))
    t = days("2000-01-01T00:00:00", 12 * 1461 // 4)
    roemer = wavefront_terms(t, reference, source).terms_s["Roemer delay"]
    phase = 2 * np.pi * (t[0] - t[0][0]) / (365.25636 * 86400)  # sidereal year, d
    design = np.stack([np.cos(phase), np.sin(phase), np.ones_like(phase), phase], axis=1)
    fitted = np.linalg.lstsq(design, roemer, rcond=None)[0]
    assert np.hypot(fitted[0], fitted[1]) == pytest.approx(499.004784 * np.cos(b), abs=0.15)


def test_dates_at_the_barycentre_lie_on_a_smooth_curve(reference: tscale.ReferenceData) -> None:
    # Over 40 s a polynomial of degree 4 follows the delay to 1e-17 s; what is left is rounding.
    at_s = np.arange(2000) * 0.02
    whole, fraction = one("2025-03-01T00:00:30")
    t = (whole + np.floor(at_s).astype(np.int64), fraction + (at_s - np.floor(at_s)))
    chain = tscale.chain("TDB", "TDB@BARYCENTER", site=SITE, source=tscale.Source(187.25, -12.64, 30.0, -20.0, 5.0))
    start = tscale.Instants.from_seconds(*t, scale="TDB", place="TOPOCENTER")
    later = exact.subtract(chain(start).pair, start.pair)
    delay = (later[0] - later[0][0]) + later[1]
    left = delay - np.polynomial.Polynomial.fit(at_s, delay, 4)(at_s)
    assert np.std(left) < 1e-14
    assert np.max(np.abs(left)) < 5e-14


def test_roemer_delay_against_astropy(reference: tscale.ReferenceData) -> None:
    # astropy's barycentric light travel time from the same kernel. Three things are left out or added there:
    # * scale and Lorentz terms of the site vector (0.16 and 0.1 m at most, IERS Conventions 2010 eq. 11.19): 0.6 ns;
    # * Earth orientation is interpolated in a straight line: 20 us of UT1, 1 cm, 0.1 ns;
    # * the site vector is turned by the aberration, since the transformation from GCRS to ICRS takes it for a direction
    #   of light: 20.5 arcsec x 6378 km, 2.1 us.
    # Bounds: 2.2 us as it stands; 1 ns against n.x of astropy's own Earth and site vectors; 0.15 ns once the first
    # is put in; and the light travel time itself to 1 ns once the aberration is put in.
    from astropy import coordinates
    from astropy import units as u
    from astropy.time import Time
    from astropy.utils import iers

    rng = np.random.default_rng(11)
    t = tscale.Instants.from_seconds(rng.integers(-800_000_000, 800_000_000, 200), rng.random(200), scale="UTC")
    source = tscale.Source(ra_deg=201.3, dec_deg=-43.0)
    tdb = tscale.chain("UTC", "TDB", site=SITE)(t)
    ours = wavefront_terms(tdb.pair, reference, source, SITE).terms_s["Roemer delay"]
    kernel = str(shipped_path("de440_1960_2060.bsp"))
    with iers.conf.set_temp("auto_download", False), coordinates.solar_system_ephemeris.set(kernel):
        location = coordinates.EarthLocation.from_geocentric(1_200_000.0, -4_600_000.0, 4_230_000.0, unit=u.m)
        day, fraction = t.to_jd()
        time = Time(day, fraction, format="jd", scale="utc", location=location)
        there = coordinates.SkyCoord(201.3 * u.deg, -43.0 * u.deg, frame="icrs")
        theirs = time.light_travel_time(there, kind="barycentric", ephemeris=kernel).to_value(u.s)
        site_m = location.get_gcrs_posvel(time)[0].xyz.to_value(u.m).T
        earth_m = coordinates.get_body_barycentric("earth", time).xyz.to_value(u.m).T
    n = source.direction(tdb.pair)
    assert np.max(np.abs(ours - theirs)) < 2.2e-6
    parts = np.sum((earth_m + site_m) * n, axis=-1) / C_M_S
    assert np.max(np.abs(ours - parts)) < 1e-9

    x, _, _, _ = observer_state(tdb.pair, reference, SITE)
    earth, velocity = reference.ephemeris.state("earth", tdb.pair)
    r_m, _ = SITE.gcrs(tscale.chain("UTC", "TT")(t).pair, reference)
    left_out = np.sum((x - earth - r_m) * n, axis=-1) / C_M_S
    assert np.max(np.abs(left_out)) > 2e-10
    assert np.max(np.abs(ours - left_out - parts)) < 1.5e-10

    radius = np.linalg.norm(r_m, axis=-1, keepdims=True)
    up, beta = r_m / radius, velocity / C_M_S
    aberration_m = (beta - up * np.sum(up * beta, axis=-1, keepdims=True)) * -radius
    assert np.max(np.abs(ours + np.sum(aberration_m * n, axis=-1) / C_M_S - theirs)) < 1e-9


def test_curvature_against_fifty_digits(reference: tscale.ReferenceData) -> None:
    # (|b - x| - |b|) + n.x in 50-digit decimals, from 0.5 pc to 100 kpc; 1e-13 s is the rounding of x itself.
    getcontext().prec = 50
    t = days("2031-03-01T00:00:00", 40, 9 * 86400)
    x, _, _, _ = observer_state(t, reference, None)
    for parallax_mas in (2000.0, 1000.0, 1.0, 0.01):
        source = tscale.Source(83.6, 22.0, parallax_mas=parallax_mas)
        term = wavefront_terms(t, reference, source).terms_s["parallax (curvature)"]
        k = source.direction(t)
        for i in range(40):
            r = [Decimal(float(v)) for v in x[i]]
            n = [Decimal(float(v)) for v in k[i]]
            norm = sum(v * v for v in n).sqrt()
            b = [v / norm * Decimal(source.distance_m) for v in n]
            path = sum((p - q) ** 2 for p, q in zip(b, r, strict=True)).sqrt() - Decimal(source.distance_m)
            along = sum(p * q for p, q in zip(n, r, strict=True)) / norm
            assert float(-(path + along) / Decimal(C_M_S)) == pytest.approx(term[i], abs=1e-13)


def test_curvature_reaches_1_2_milliseconds_at_one_parsec(reference: tscale.ReferenceData) -> None:
    # r^2/(2 c d) at 1 au and 1 pc, 1.2096 ms: 499.004784 s / (2 x 206264.806); the barycentre's own walk adds 2 %.
    t = days("2020-01-01T00:00:00", 366)
    source = source_toward(np.array([0.0, -np.sin(0.40909), np.cos(0.40909)]), parallax_mas=1000.0)  # ecliptic pole
    term = wavefront_terms(t, reference, source).terms_s["parallax (curvature)"]
    assert source.distance_m == pytest.approx(3.0856775814913673e16, rel=1e-10)  # IAU 2015 B2
    assert -term == pytest.approx(np.full(366, 499.004784 / (2 * 206264.806)), rel=0.05)


def grazing(reference: tscale.ReferenceData, t: tscale.exact.Pair, body: str, radius_m: float) -> tuple[float, float]:
    """Delay of a body at its limb minus opposite to it, s, and the distance of the body, m."""
    earth = reference.ephemeris.position("earth", t)
    place, velocity = reference.ephemeris.state(body, t)
    toward = place - velocity * (np.linalg.norm(place - earth) / C_M_S) - earth
    distance = float(np.linalg.norm(toward))
    across = np.cross(toward, [0.0, 0.0, 1.0])
    across /= np.linalg.norm(across)
    limb = toward / distance + np.tan(radius_m / distance) * across
    name = f"minus Shapiro delay, {body}"
    at_limb = wavefront_terms(t, reference, source_toward(limb)).terms_s[name]
    opposite = wavefront_terms(t, reference, source_toward(-toward)).terms_s[name]
    return float(opposite - at_limb), distance


def test_gravitational_delay_at_the_limb_of_the_sun(reference: tscale.ReferenceData) -> None:
    # Shapiro 1964 and later texts: about 120 us one way; (2GM/c^3) ln[2 / (1 - cos(959.63"))] = 119.471 us at 1 au
    # (own calculation of the closed form). 0.4 us for the Earth's distance through the year.
    for text in ("2024-01-03T00:00:00", "2024-04-04T00:00:00", "2024-07-05T00:00:00"):
        delay, _ = grazing(reference, one(text), "sun", SUN_RADIUS_M)
        assert delay == pytest.approx(119.471e-6, abs=0.4e-6)


@pytest.mark.parametrize(
    ("body", "radius_m", "low_s", "high_s"),
    [
        # Closed form peak to peak over the distances of the planet; the literature gives about 180-200 ns for Jupiter
        # (from memory). Equatorial radii: IAU WGCCRE 2015. Both ends are open by 1 ns for distances beyond the range.
        ("jupiter", 71_492e3, 182.8e-9, 192.2e-9),
        ("saturn", 60_268e3, 59.0e-9, 63.0e-9),
    ],
)
def test_gravitational_delay_at_the_limb_of_planets(
    reference: tscale.ReferenceData, body: str, radius_m: float, low_s: float, high_s: float
) -> None:
    for text in ("2019-06-10T00:00:00", "2022-03-05T00:00:00", "2024-12-07T00:00:00"):
        delay, distance = grazing(reference, one(text), body, radius_m)
        gm = reference.ephemeris.gm_m3_s2(body)
        angle = np.tan(radius_m / distance)
        # 1e-4: the factor (1 + n.v/c) of a moving planet, whose sign changes from one side of the sky to the other.
        assert delay == pytest.approx(2 * gm / C_M_S**3 * np.log(2 / (1 - np.cos(np.arctan(angle)))), rel=1e-4)
        assert low_s < delay < high_s


def test_bodies_are_taken_where_the_light_passed_them(reference: tscale.ReferenceData) -> None:
    # Straight-line retardation against the kernel at the retarded date itself, at the limb of Jupiter: 0.2 ps.
    t = one("2024-12-07T00:00:00")
    earth = reference.ephemeris.position("earth", t)
    early = t
    for _ in range(5):
        place = reference.ephemeris.position("jupiter", early)
        early = exact.add_seconds(t, -np.linalg.norm(place - earth) / C_M_S)
    toward = (place - earth) / np.linalg.norm(place - earth)
    limb = toward + 71_492e3 / np.linalg.norm(place - earth) * np.cross(toward, [0.0, 0.0, 1.0])
    source = source_toward(limb)
    n, r = source.direction(t), earth - place
    # The factor (1 + n.v/c) of a moving body (Kopeikin and Schaefer 1999) is 8 ps here.
    moving = 1 + n @ reference.ephemeris.state("jupiter", early)[1] / C_M_S
    expected = 2 * reference.ephemeris.gm_m3_s2("jupiter") / C_M_S**3 * moving
    expected *= np.log((np.linalg.norm(r) + n @ r) / AU_M)
    found = wavefront_terms(t, reference, source).terms_s["minus Shapiro delay, jupiter"]
    assert float(found) == pytest.approx(expected, abs=2e-13)
    now = earth - reference.ephemeris.position("jupiter", t)
    unretarded = 2 * reference.ephemeris.gm_m3_s2("jupiter") / C_M_S**3 * np.log((np.linalg.norm(now) + n @ now) / AU_M)
    assert abs(unretarded - expected) > 1e-9  # the difference that the retardation makes


def test_second_order_at_the_limb(reference: tscale.ReferenceData) -> None:
    # The bending term is what turns ln(d) into ln(d + 2 GM/c^2) (Moyer 2003, eq. 8-54, from memory), d = r + n.r: 18 ns
    # at the limb for a far source. The rest, 15 pi/4 (GM/c^2)^2/(b c) = 0.12 ns, is 1 % of it. Richter & Matzner 1983
    # give about 10 ns for a round trip to a planet, where the distances are shorter.
    t = one("2024-04-04T00:00:00")
    earth, sun = reference.ephemeris.positions(("earth", "sun"), t)
    toward = (sun - earth) / np.linalg.norm(sun - earth)
    across = np.cross(toward, [0.0, 0.0, 1.0])
    source = source_toward(
        toward + 1.001 * SUN_RADIUS_M / np.linalg.norm(sun - earth) * across / np.linalg.norm(across)
    )
    terms = wavefront_terms(t, reference, source, second_order=True).terms_s
    m = reference.ephemeris.gm_m3_s2("sun") / C_M_S**2
    # The Sun where the light passed it: it moves 7 km meanwhile, 3e-5 of d.
    sun = sun - reference.ephemeris.state("sun", t)[1] * (np.linalg.norm(earth - sun) / C_M_S)
    d = np.linalg.norm(earth - sun) + source.direction(t) @ (earth - sun)
    assert float(terms["minus Shapiro delay, sun, second order"]) == pytest.approx(
        2 * m / C_M_S * np.log1p(2 * m / d), rel=0.02
    )
    assert 10e-9 < float(terms["minus Shapiro delay, sun, second order"]) < 25e-9
    # The third order, 8 (GM/c^2)^3/(c d^2), from the next term of the same logarithm's lens: 31 ps (link.delay).
    assert float(terms["minus Shapiro delay, sun, third order"]) == pytest.approx(
        -8 * m**3 / (C_M_S * d**2), rel=1e-6, abs=0
    )
    assert -35e-12 < float(terms["minus Shapiro delay, sun, third order"]) < -25e-12


def test_a_line_of_sight_through_the_sun_is_noted(reference: tscale.ReferenceData) -> None:
    t = tscale.Instants.from_iso(["2024-04-04T00:00:00", "2024-06-04T00:00:00"], scale="TDB", place="GEOCENTER")
    earth, sun = reference.ephemeris.positions(("earth", "sun"), t[0].pair)
    chain = tscale.chain("TDB@GEOCENTER", "TDB@BARYCENTER", source=source_toward(sun - earth))
    assert chain.notes(t) == ("1 of 2 lines of sight pass through the Sun",)
    assert np.all(np.isfinite(chain.ledger(t).total))


@pytest.mark.parametrize("side", [1.001, -1.001, 1e6])
def test_a_wavefront_is_a_link_from_far_away(reference: tscale.ReferenceData, side: float) -> None:
    # The two-point delay of the links (IERS Conventions 2010, eq. 11.17, in the frame of the moving body) from a point
    # 10 light years away, less (2GM/c^3) ln(2 distance / au): what is left is (n.v/c) 2GM/c^3 in the logarithm, 0.9 ps
    # at most for Jupiter. Without the factor (1 + n.v/c) the limb would be off by 7 ps.
    t = one("2024-12-07T00:00:00")
    earth, earth_v = reference.ephemeris.state("earth", t)
    place, velocity = reference.ephemeris.state("jupiter", t)
    toward = place - velocity * (np.linalg.norm(place - earth) / C_M_S) - earth
    across = np.cross(toward, [0.0, 0.0, 1.0])
    source = source_toward(toward + side * 71_492e3 * across / np.linalg.norm(across))
    n = source.direction(t)
    light_s = 3e8
    start = earth + n * light_s * C_M_S
    ray = Ray(exact.add_seconds(t, -light_s), np.asarray(light_s), start, 0.0 * start, earth, earth_v)
    pull = gravity(ray, reference.ephemeris, ("jupiter",), second_order=False, clear=frozenset())
    factor = 2 * reference.ephemeris.gm_m3_s2("jupiter") / C_M_S**3 * (1 + n @ velocity / C_M_S)
    theirs = float(pull.total_s) - factor * np.log(2 * light_s * C_M_S / AU_M)
    ours = -float(wavefront_terms(t, reference, source).terms_s["minus Shapiro delay, jupiter"])
    assert ours == pytest.approx(theirs, abs=0.9e-12)


def test_an_observer_at_the_centre_of_a_body_is_refused(reference: tscale.ReferenceData) -> None:
    start = tscale.Instants.from_iso("2024-01-01T00:00:00", scale="TDB")
    t = start.shifted(np.linspace(0.0, 8e7, 20_000))
    for number in (4, 5, 10, 301):
        body = tscale.Trajectory.from_spk(str(reference.ephemeris.path), number)
        chain = tscale.chain("TDB", "TDB@BARYCENTER", site=body, source=tscale.Source(10.0, 10.0))
        for act in (chain, chain.rate, chain.ledger):
            with pytest.raises(tscale.errors.GeometryError) as caught:
                act(t)
            assert caught.value.mask is not None
            assert caught.value.mask.sum() == 20_000


def test_what_hides_the_source_from_an_orbit_is_noted() -> None:
    # Over one turn of a low orbit the Earth covers a source near its plane for asin(R/a)/pi = 36 % of the time.
    epoch = tscale.Instants.from_iso("2024-03-01T00:00:00", scale="TT")
    orbit = tscale.Trajectory.from_kepler(epoch, 7.0e6, 0.0, 0.0, 0.0, 0.0, 0.0, name="orbit")
    t = epoch.shifted(np.linspace(0.0, 5828.5, 1000, endpoint=False))
    chain = tscale.chain("TT", "TDB@BARYCENTER", site=orbit, source=tscale.Source(30.0, 0.0))
    (note,) = chain.notes(t)
    assert note.endswith("of 1000 lines of sight pass through the Earth")
    assert int(note.split()[0]) == pytest.approx(363, abs=3)


def test_proper_motion_is_counted_at_the_barycentre(reference: tscale.ReferenceData) -> None:
    # 10.3 arcsec a year for 30 years moves the source by 5 arcmin: 0.75 s of delay at most, and a delay computed with
    # the direction of the observer's date instead of the barycentre's would be off by up to 0.4 us.
    t = days("2030-01-01T12:00:00", 50, 7 * 86400)
    still = tscale.Source(269.45, 4.69)
    moving = tscale.Source(269.45, 4.69, pm_ra_cosdec_mas_yr=-801.6, pm_dec_mas_yr=10362.4)
    x, _, _, _ = observer_state(t, reference, None)
    arrival = exact.add_seconds(t, wavefront_terms(t, reference, moving).terms_s["Roemer delay"])
    expected = np.sum(x * moving.direction(arrival), axis=-1) / C_M_S
    found = wavefront_terms(t, reference, moving).terms_s["Roemer delay"]
    assert np.max(np.abs(found - expected)) < 1e-12
    assert 0.1 < np.max(np.abs(found - wavefront_terms(t, reference, still).terms_s["Roemer delay"])) < 0.8


@pytest.mark.parametrize("end", ["TDB@BARYCENTER", "TCB@BARYCENTER", "TDB@GEOCENTER"])
@pytest.mark.parametrize("parallax_mas", [0.0, 700.0])
def test_rate_of_the_whole_map_against_differencing(end: str, parallax_mas: float) -> None:
    # Five-point differences of the exact pairs, 16 s apart: rounding of 1e-13 s over 16 s, 2e-14.
    t = tscale.Instants.from_seconds(np.arange(40) * 2_000_003 - 700_000_000, 0.3, scale="UTC")
    source = tscale.Source(150.0, 12.0, 400.0, -300.0, parallax_mas)
    chain = tscale.chain("UTC", end, site=SITE, source=source)
    h = 16.0

    def gain(step_s: float) -> np.ndarray:
        whole, fraction = chain(t.shifted(step_s)).minus_exact(chain(t))
        shift = exact.from_seconds(step_s)
        return exact.seconds(exact.subtract((whole, fraction), shift))

    numeric = (8 * (gain(h) - gain(-h)) - (gain(2 * h) - gain(-2 * h))) / (12 * h)
    assert np.max(np.abs(numeric - chain.rate(t))) < 5e-14
    assert np.max(np.abs(chain.rate(t))) > 1e-7


def test_rate_of_the_higher_orders_near_the_sun(reference: tscale.ReferenceData) -> None:
    # Differences of the second and third order alone, 60 s apart, at 1.2 solar radii: 1e-12 in the rate, to 1e-3 of it.
    t0 = one("2024-04-04T00:00:00")
    earth, sun = reference.ephemeris.positions(("earth", "sun"), t0)
    toward = sun - earth
    across = np.cross(toward, [0.0, 0.0, 1.0])
    source = source_toward(toward + 1.2 * SUN_RADIUS_M * across / np.linalg.norm(across))

    def terms(shift_s: float, second_order: bool) -> tuple[float, float]:
        found = wavefront_terms(exact.add_seconds(t0, shift_s), reference, source, second_order=second_order)
        return sum(float(v) for k, v in found.terms_s.items() if "order" in k), float(found.rate)

    numeric = (terms(30.0, True)[0] - terms(-30.0, True)[0]) / 60.0
    analytic = terms(0.0, True)[1] - terms(0.0, False)[1]
    assert abs(analytic) > 1e-13
    assert analytic == pytest.approx(numeric, rel=1e-3, abs=0)


def test_rate_of_scales_at_one_place_against_differencing() -> None:
    # UTC to TDB at a site, over 16 s: 2e-16 s of rounding, 5e-17.
    t = tscale.Instants.from_seconds(np.arange(40) * 2_000_003 - 700_000_000, 0.3, scale="UTC")
    for end in ("TDB", "TCB", "TCG"):
        chain = tscale.chain("UTC", end, site=SITE)

        def gain(step_s: float, chain: tscale.Chain = chain) -> np.ndarray:
            return exact.seconds(
                exact.subtract(chain(t.shifted(step_s)).minus_exact(chain(t)), exact.from_seconds(step_s))
            )

        numeric = (8 * (gain(16.0) - gain(-16.0)) - (gain(32.0) - gain(-32.0))) / (12 * 16.0)
        assert np.max(np.abs(numeric - chain.rate(t))) < 1e-16


def test_a_moving_observatory_works_in_the_same_call(reference: tscale.ReferenceData) -> None:
    # States of the site itself as a trajectory must give the site's dates: 1 min knots of position and velocity leave
    # (60 s)^4/384 x 465 m/s x (7.3e-5/s)^3 = 6 um, 2e-14 s.
    start = tscale.Instants.from_iso("2024-05-01T00:00:00", scale="UTC")
    knots = start.shifted(60.0 * np.arange(121))
    r_m, v_m_s = SITE.gcrs(tscale.chain("UTC", "TT")(knots).pair, reference)
    orbit = tscale.Trajectory.from_states(knots, r_m, v_m_s, frame="GCRS")
    t = start.shifted(np.linspace(0.0, 7200.0, 50))
    source = tscale.Source(83.6, 22.0)
    from_site = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=source)
    from_orbit = tscale.chain("UTC", "TDB@BARYCENTER", site=orbit, source=source)
    assert np.max(np.abs(from_orbit(t).minus(from_site(t)))) < 1e-12
    assert np.max(np.abs(from_orbit.inverse(from_orbit(t)).minus(t.at("TOPOCENTER")))) < 1e-13
    with pytest.raises(tscale.TscaleError):
        from_orbit(start.shifted(7300.0))


@pytest.mark.parametrize(
    "bad",
    [
        {"ra_deg": float("nan"), "dec_deg": 0.0},
        {"ra_deg": 12.0, "dec_deg": 91.0},
        {"ra_deg": 400.0, "dec_deg": 0.0},
        {"ra_deg": 12.0, "dec_deg": 0.0, "parallax_mas": -1.0},
        {"ra_deg": 12.0, "dec_deg": 0.0, "parallax_mas": 2e4},
        {"ra_deg": 12.0, "dec_deg": 0.0, "pm_dec_mas_yr": float("inf")},
        {"ra_deg": 12.0, "dec_deg": 0.0, "epoch": "yesterday"},
        {"ra_deg": "12h", "dec_deg": 0.0},
    ],
)
def test_source_validates(bad: dict[str, object]) -> None:
    with pytest.raises(tscale.errors.InvalidInput):
        tscale.Source(**bad)  # type: ignore[arg-type]
