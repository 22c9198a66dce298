"""Make the first inputs of every target anew; what fuzzing found stays beside them under names that begin with `found`.

python tests/abuse/make_corpus.py
"""

from __future__ import annotations

import hashlib
import io
import json
import re
import struct
import tempfile
from pathlib import Path

import numpy as np

import tscale
from tscale.ephemeris.spk_writer import spk_bytes
from tscale.serial import to_json
from tscale.timecodes import ccsds

HERE = Path(__file__).parent
CORPUS = HERE / "corpus"
DATA = HERE.parent / "data"
EXAMPLES = HERE.parent.parent / "examples"


def write(name: str, *contents: bytes | str) -> None:
    folder = CORPUS / name
    folder.mkdir(parents=True, exist_ok=True)
    for path in folder.glob("seed*"):
        path.unlink()
    for i, content in enumerate(contents):
        (folder / f"seed{i:02}").write_bytes(content.encode() if isinstance(content, str) else content)


def texts() -> None:
    dates = "2016-12-31T23:59:60.5\n2025-01-01\n1972-06-30T23:59:60"
    write(
        "iso_dates",
        "\0" + dates,
        "\1-00099-03-01T04:05:06.123456789012345\n+012345-01-01",
        "\0001961-01-02T03:04\n2024-02-29",
    )
    write(
        "date_text",
        "\0" + "57753.99999999999999\n60676.5",
        "\3" + "2460676.25\n2444444",
        "\6" + "-123456789.123456789012345678\n5",
    )
    write("nodes", "UTC\nTDB@GEOCENTER", "TT(BIPM23)@GEOCENTER\nTCG@GEOCENTER", "CLOCK(maser)\nTCL@SELENOCENTER")
    values = np.array([0, 700_000_000, -(2**62)], "<i8").tobytes() + np.array([0.0, 0.5, 1e-300], "<f8").tobytes()
    counts = np.array([7, 700_000_000, 30], "<i8").tobytes() + np.array([0.0, 0.5, 1e-300], "<f8").tobytes()
    small = np.array([2012, 6, 30, 23, 59, 60], "<i8").tobytes() + np.array([0.5] * 6, "<f8").tobytes()
    late = np.array([2451544, 2457753], "<i8").tobytes() + np.array([0.25, 0.999999], "<f8").tobytes()
    days = np.array([51544, 57753], "<i8").tobytes() + np.array([0.25, 0.999999], "<f8").tobytes()
    write(
        "numbers",
        *(
            bytes([i])
            + (small if i == 11 else days if i in (2, 3) else late if i in (4, 5) else counts if i else values)
            for i in range(12)
        ),
    )
    write("datetime64", *(bytes([i]) + np.array([40, 9, 1500], "<i8").tobytes() for i in (3, 6, 9, 12)))
    t = tscale.Instants.from_iso(["2024-05-06T07:08:09.123"], "UTC")
    tai = tscale.chain("UTC", "TAI")(t)
    codes = [ccsds.to_cuc(tai), ccsds.to_cds(t), ccsds.to_ccs(t)]
    write(
        "space_codes",
        *(bytes([i]) + np.asarray(code).tobytes() for i, code in enumerate(codes)),
        "\0032024-05-06T07:08:09.123Z\n2024-127T07:08:09Z",
        *(bytes([i + 4]) + np.asarray(code).tobytes() for i, code in enumerate(codes)),
    )
    write(
        "delimited",
        '\1# a comment\na,b,c\n1,"x,""y""",3\n\n# another\n4,"two\nlines",6\n',
        "\2t;u\r\n2025-01-01;5\r\n",
        "\3t\tu\n1\t2\n",
        "\0\ufefft,u\n1,2\n",
    )
    write("command", "t,flux\n2025-01-01T00:00:00,1\n2016-12-31T23:59:60.25,2\n", "# c\r\nday\r\n2020-02-29\r\n")


def tables() -> None:
    from astropy_iers_data import IERS_A_FILE, IERS_B_FILE, IERS_LEAP_SECOND_FILE

    dat = Path(IERS_LEAP_SECOND_FILE).read_text()
    digits = "39451968003991593600227206080010228778560011"
    words = re.findall("." * 8, hashlib.sha1(digits.encode()).hexdigest())
    listed = "#$\t3945196800\n#@\t3991593600\n2272060800\t10\t# 1 Jan 1972\n2287785600\t11\n#h\t" + " ".join(words)
    write("leap_seconds", dat, listed)
    steps = [line.split() for line in dat.splitlines() if not line.startswith("#")]
    rows = "".join(f"{(int(float(row[0])) - 15020) * 86400}\t{row[4]}\n" for row in steps)
    write("leap_list", "#$\t3945196800\n#@\t3991593600\n" + rows)
    finals = Path(IERS_A_FILE).read_text().splitlines(keepends=True)
    known = next(i for i, line in enumerate(finals) if line[57:58] == "P")
    c04 = Path(IERS_B_FILE).read_text().splitlines(keepends=True)
    head = [line for line in c04 if line.startswith("#")]
    rows = [line for line in c04 if not line.startswith("#")]
    write("earth_orientation", "".join(finals[known - 4 : known + 3]), "".join(head + rows[-5:]))
    write(
        "tt_bipm",
        " Rows: MJD, TT-EAL and TT-TAI less 32.184 s in microseconds\n\n 42589.    46.258    46.258\n"
        "42599.    45.439    45.439\n42609      44.620     44.620\n",
    )
    write("circular", *(p.read_bytes() for p in sorted((DATA / "circular").iterdir())))
    log = (EXAMPLES / "maser.csv").read_text().splitlines(keepends=True)
    full = (
        "epoch,offset_s,uncertainty_s,reference,clock,use,reset_s,rate_step\n"
        "2025-01-01T00:00:00,1e-6,1e-9,UTC,maser,yes,,\n2025-01-02T00:00:00,,,UTC,maser,yes,,\n"
        "2025-01-03T00:00:00,1.2e-6,1e-9,UTC,maser,no,,\n2025-01-04T00:00:00,2.2e-6,1e-9,UTC,maser,yes,1e-6,yes\n"
    )
    for name in ("clock_log", "clock_inspection"):
        write(name, "".join(log[:8]), full, (EXAMPLES / "utc_krl.csv").read_bytes())


def places() -> None:
    for name in ("source", "site"):
        write(f"{name}_toml", (EXAMPLES / f"{name}.toml").read_bytes())
    itrf = '[site]\nname = "A"\n'
    itrf += "itrf = { x_m = 1200000.0, y_m = -4600000.0, z_m = 4230000.0 }\nheight_above_geoid_m = 12.5\n"
    write("site_toml", (EXAMPLES / "site.toml").read_bytes(), itrf)
    surface = '[surface]\nname = "Mare"\nbody = "moon"\nlon_deg = 12.0\nlat_deg = -33.5\nheight_m = 120.0\n'
    write("surface_toml", surface, surface.replace("moon", "mars"))
    write("end_toml", (EXAMPLES / "link_pass.toml").read_bytes(), surface)
    project = (
        'site = "site.toml"\nclocks = ["maser.csv", "utc_krl.csv"]\ninterpolation = "cubic"\nmax_gap_s = 1e5\n'
        "sub_daily = true\n[noise.maser]\nwhite_frequency = 1e-13\n[predict.maser]\nfit_s = 86400.0\ndrift = true\n"
    )
    write("project_toml", project, project + (EXAMPLES / "source.toml").read_text())
    lines = (EXAMPLES / "flight_east.csv").read_text().splitlines(keepends=True)
    write("flight", "".join(line for line in lines if not line.startswith("#"))[:400].rpartition("\n")[0] + "\n")
    write("gravity", (DATA / "invented_field.gfc").read_bytes())
    write("oem", _oem(), _oem_xml())


def _states() -> list[tuple[str, list[str]]]:
    found = []
    for i in range(6):
        a = 0.06 * i
        r = [7000 * np.cos(a), 7000 * np.sin(a), 10.0 * i]
        v = [-7.5 * np.sin(a), 7.5 * np.cos(a), 0.01]
        found.append((f"2021-05-04T00:{i:02}:00", [f"{x:.6f}" for x in (*r, *v)]))
    return found


_META = {
    "OBJECT_NAME": "TERN-2",
    "OBJECT_ID": "2031-042A",
    "CENTER_NAME": "EARTH",
    "REF_FRAME": "ICRF",
    "TIME_SYSTEM": "UTC",
    "START_TIME": "2021-05-04T00:00:00",
    "STOP_TIME": "2021-05-04T00:05:00",
    "INTERPOLATION": "LAGRANGE",
    "INTERPOLATION_DEGREE": "3",
}


def _oem() -> str:
    rows = "\n".join(" ".join([epoch, *words]) for epoch, words in _states())
    meta = "\n".join(f"{key} = {value}" for key, value in _META.items())
    return (
        "CCSDS_OEM_VERS = 2.0\nCOMMENT invented\nCREATION_DATE = 2021-05-05T00:00:00\nORIGINATOR = TERN\n"
        f"META_START\n{meta}\nMETA_STOP\n{rows}\n"
    )


def _oem_xml() -> str:
    keys = ("X", "Y", "Z", "X_DOT", "Y_DOT", "Z_DOT")
    rows = "".join(
        f"<stateVector><EPOCH>{epoch}</EPOCH>{''.join(f'<{k}>{w}</{k}>' for k, w in zip(keys, words, strict=True))}"
        "</stateVector>\n"
        for epoch, words in _states()
    )
    meta = "".join(f"<{key}>{value}</{key}>\n" for key, value in _META.items())
    return (
        '<?xml version="1.0" encoding="UTF-8"?>\n<oem id="CCSDS_OEM_VERS" version="2.0"><header>'
        "<CREATION_DATE>2021-05-05T00:00:00</CREATION_DATE><ORIGINATOR>TERN</ORIGINATOR></header>\n<body><segment>"
        f"<metadata>{meta}</metadata><data>{rows}</data></segment></body></oem>\n"
    )


def kernels() -> None:
    rng = np.random.default_rng(1)
    shape = {"start_s": 0.0, "step_s": 86400.0, "coefficients": rng.normal(size=(3, 3, 4))}
    constants = " AU  0.149597870700000000D+09\n EMRAT 0.813005682214972154D+02\n GMB 0.8997011390199871D-09\n"
    small = spk_bytes(title="invented", comment=constants, target=301, center=3, **shape)
    probe = spk_bytes(title="probe", comment="none\n", target=-900, center=399, **shape)
    clock = spk_bytes(title="time", comment="none\n", target=1000000001, center=1000000000, **shape)
    write("kernel", small, probe)
    write("kernel_way", probe, _states_kernel(9), _states_kernel(13))
    write("time_kernel", clock, re.sub(rb"SHA-256 of the segment: [0-9a-f]{64}", b" " * 88, clock))


def _states_kernel(kind: int) -> bytes:
    """A kernel of tabulated states (SPK data types 9 and 13): the Chebyshev one with other words in its segment."""
    rng = np.random.default_rng(2)
    content = spk_bytes(
        title="states",
        comment="none\n",
        target=-900,
        center=399,
        start_s=0.0,
        step_s=1e3,
        coefficients=np.zeros((4, 3, 5)),
    )
    words = 4 * 17 + 4
    at = len(content) - (-(-words * 8 // 1024)) * 1024
    n = 8
    states = rng.normal(size=(n, 6)) * [7e3, 7e3, 7e3, 7, 7, 7]
    new = np.concatenate([states.ravel(), 500.0 * np.arange(n), [3.0, float(n)]])
    assert new.size <= words
    body = bytearray(content)
    # The descriptor: two doubles and six integers behind the three of its record.
    place = content.index(struct.pack("<4i", -900, 399, 1, 2))
    (first,) = struct.unpack_from("<i", content, place + 16)
    struct.pack_into("<d", body, place - 8, 3500.0)
    struct.pack_into("<6i", body, place, -900, 399, 1, kind, first, first + new.size - 1)
    assert at <= (first - 1) * 8
    body[(first - 1) * 8 : (first - 1) * 8 + new.nbytes] = new.tobytes()
    return bytes(body)


def files() -> None:
    import pyarrow as pa
    from pyarrow import parquet

    from tscale.files.arrow_columns import date_columns

    t = tscale.Instants.from_iso(["2025-01-01", "2025-02-03T04:05:06.7"], "UTC")
    table = date_columns("time", t)
    stamps = pa.table({"when": pa.array(["2025-01-01", None, "2025-01-03"]), "x": [1, 2, 3]})
    with tempfile.TemporaryDirectory() as folder:
        found = []
        for i, one in enumerate((table, stamps)):
            path = Path(folder) / f"{i}.parquet"
            parquet.write_table(one, path)
            found.append(path.read_bytes())
        write("parquet", *found)
        stream = io.BytesIO()
        with pa.ipc.new_file(stream, table.schema) as file:
            file.write_table(table)
        write("arrow", stream.getvalue())
        chain = tscale.chain("UTC", "TT@GEOCENTER").compile("2020-01-01", "2020-01-02", tolerance_s=1e-12)
        chain.save(Path(folder) / "chain")
        content = (Path(folder) / "chain").read_bytes()
        write("compiled", content)
        write("compiled_sealed", content)
    write("fits", _fits())


def _fits() -> bytes:
    from astropy.io import fits

    frame = {"TIMESYS": "UTC", "MJDREFI": 55197, "MJDREFF": 0.00076601852, "TIMEUNIT": "s", "TIMEREF": "LOCAL"}
    frame |= {"TREFPOS": "TOPOCENTER", "OBSGEO-X": 1.2e6, "OBSGEO-Y": -4.6e6, "OBSGEO-Z": 4.23e6}
    frame |= {"RADESYS": "ICRS", "RA_OBJ": 83.6, "DEC_OBJ": 22.0, "TIMEZERO": 0.0, "DATE-OBS": "2012-01-01T00:00:00"}
    columns = [fits.Column("TIME", "D", array=[6.3e7, 6.3e7 + 0.5]), fits.Column("PI", "J", array=[5, 6])]
    events = fits.BinTableHDU.from_columns(columns, fits.Header(frame), name="EVENTS")
    good = fits.BinTableHDU.from_columns(
        [fits.Column("START", "D", array=[6.3e7]), fits.Column("STOP", "D", array=[6.4e7])],
        fits.Header(frame),
        name="GTI",
    )
    stream = io.BytesIO()
    fits.HDUList([fits.PrimaryHDU(), events, good]).writeto(stream)
    return stream.getvalue()


def documents() -> None:
    site = tscale.Site.from_geodetic("A", 12.0, 45.0, 100.0)
    source = tscale.Source(83.6, 22.0, parallax_mas=0.5, name="star")
    t = tscale.Instants.from_iso(["2025-01-01", "2025-01-02"], "UTC")
    log = tscale.ClockLog.load(EXAMPLES / "utc_krl.csv")
    orbit = tscale.Trajectory.from_kepler(t[0], 7e6, 0.01, 97.0, 20.0, 30.0, 40.0, center="earth")
    chain = tscale.chain("UTC", "TDB@BARYCENTER", site=site, source=source)
    found = []
    for item in (site, source, t, log, orbit, chain, chain.ledger(t)):
        document = json.loads(to_json(item))
        del document["document_sha256"]  # so that what lies behind it is reached
        found.append(json.dumps(document, separators=(",", ":")))
    write("json", *found, to_json(site))


def main() -> None:
    for make in (texts, tables, places, kernels, files, documents):
        make()
    size = sum(path.stat().st_size for path in CORPUS.rglob("*") if path.is_file())
    print(f"{size / 1e3:.0f} kB in {CORPUS}")


if __name__ == "__main__":
    main()
