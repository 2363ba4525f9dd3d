"""Small files of the kinds that the matrix of dialects leaves out, for the fuzzer to begin from."""

from __future__ import annotations

import numpy as np

FREQUENCY = np.logspace(5, -1, 13)
_S = 2j * np.pi * FREQUENCY
Z = 120 + 1 / (2e-9 * _S**0.95 + 1 / (4e6 + 1 / (3e-7 * _S**0.85)))


def _table(heading: str, *columns: object, delimiter: str = ";") -> str:
    rows = zip(*[np.asarray(c).tolist() for c in columns], strict=True)
    lines = [delimiter.join(c if isinstance(c, str) else f"{c:.6g}" for c in row) for row in rows]
    return "\n".join([*([heading] if heading else []), *lines]) + "\n"


def texts() -> list[bytes]:
    f, z = FREQUENCY, Z
    plain = _table("f (Hz);Z' (ohm);Z'' (ohm)", f, z.real, z.imag)
    polar = _table("f (kHz);|Z| (kohm);-phase", f / 1e3, np.abs(z) / 1e3, -np.degrees(np.angle(z)))
    labels = ["A1"] * 7 + ["B2"] * 6
    days = ["2026-03-08 10:00"] * 13
    two = _table("f;Z' 1 h;Z' 24 h;Z'' 1 h;Z'' 24 h", f, z.real, 2 * z.real, z.imag, 2 * z.imag)
    files = [
        plain,
        polar,
        two,
        "sep=,\n" + plain.replace(";", ","),
        plain.replace("\n", "\r"),
        "Sample: A1\nExposure time: 7 d\nDate: 2026-03-08 10:00\n\n" + plain,
        "% a comment\n# another\n" + plain + "\nmeasured by the night shift\n",
        "A1 24 h;;;B2 24 h;;\n"
        + _table("f (Hz);Z';Z'';f (Hz);Z';Z''", f, z.real, z.imag, f, z.real, z.imag),
        _table("log(f/Hz);log(|Z|/ohm);phase (deg)", np.log10(f), np.log10(abs(z)),
               np.degrees(np.angle(z))),
        _table("", f, z.real, z.imag, abs(z), np.degrees(np.angle(z))),
        _table("#;Time (s);f (Hz);E (V);Z' (ohm);Z'' (ohm)", range(13), range(13), f, f * 0 + 0.2,
               z.real, z.imag),
        _table("f (Hz);Z' (ohm cm2);Z'' (ohm cm2)", f, 10 * z.real, 10 * z.imag),
        _table("panel;date;f;Z';Z''", labels, days, f, z.real, z.imag),
        _table("exposure;f;Z';Z''", ["24 h"] * 13, f, z.real, z.imag),
        plain + "\n" + polar,
        _table("panel;f (Hz);Z' (ohm);Z'' (ohm)", labels, f, z.real, z.imag).replace(
            "A1;", "A1;overload;", 1),
    ]  # fmt: skip
    return [file.encode() for file in files]
