"""Ways to damage the bytes of a file, the same for the same random numbers."""

from __future__ import annotations

from random import Random

_TEXTS = (
    b"NaN",
    b"inf",
    b"1e999",
    b"-",
    b",",
    b";",
    b"\t",
    b"\n",
    b"\r",
    b"\x00",
    b"\xff\xfe",
    b"\xef\xbb\xbf",
    b'"',
    b"<svg onload=x>",
    b"=1+1",
    b"../../",
    b"9" * 400,
)


def mutated(content: bytes, random: Random) -> bytes:
    """The content with one to four places damaged: bits turned, bytes set, pieces taken away, put
    in, doubled, moved, filled with one byte, or the end cut off."""
    damaged = bytearray(content)
    for _ in range(random.choice((1, 1, 1, 2, 4))):
        if not damaged:
            break
        place = random.randrange(len(damaged))
        length = min(random.choice((1, 2, 4, 16, 100, 512, 4096)), len(damaged) - place)
        way = random.randrange(9)
        if way == 0:
            damaged[place] ^= 1 << random.randrange(8)
        elif way == 1:
            damaged[place] = random.randrange(256)
        elif way == 2:
            del damaged[place : place + length]
        elif way == 3:
            damaged[place:place] = random.choice(_TEXTS)
        elif way == 4:
            damaged[place:place] = damaged[place : place + length]
        elif way == 5:
            target = random.randrange(len(damaged) - length + 1)
            damaged[target : target + length] = damaged[place : place + length]
        elif way == 6:
            damaged[place : place + length] = bytes([random.choice((0, 255, 32))]) * length
        elif way == 7:
            damaged[place : place + length] = random.randbytes(length)
        elif random.random() < 0.3:
            del damaged[place:]
        else:
            damaged[place : place + 1] = random.choice((b"0", b"1", b"-", b"\x7f", b"\x80"))
    return bytes(damaged)


_TOKENS = (
    "f", "f (Hz)", "Z'", "Z''", "-Z''", "|Z|", "phase", "ω (rad/s)", "Y'", "C''", "Cp", "Rp", "Cs",
    "Rs", "Z", "kOhm", "mohm", "(Ω·cm²)", "log ", "deg", "A1", "24 h", "7 d", "Panel: A1",
    "Exposure: 24 h", "2026-03-08 10:00", "03/04/2026", "sep=;", "#", "%", "//", "time (h)", "date",
    "1,234", "1.234,5", "1'234.5", "1e999", "-1e-320", "nan", "0", "-0", "1E+05", "1.2e6-3.4e5j",
    "(1.2e6, -3.4e5)", "3+4i", "j5", '"', '""', "(", ")", "[", "/", "=", ":", "=1+1", "\t", "|",
    ",", ";", " ", "   ", "\r", "\n", "\r\n", "\n\n", "\x00", "\x0c", "\x85", "\u2028", "\u00a0",
    "−", "units: Hz, Ohm, deg", "overload", "I" * 130, "<c><v>1</v></c>", "<row>", "</row>",
    '<c t="s">', '<c r="XFD1">', "</v>", "<v>", 't="d"', 's="1"', "1e6",
)  # fmt: skip


def mutated_text(content: bytes, other: bytes, random: Random) -> bytes:
    """The content, as a table of text, with one of its lines, cells or words changed, or a stretch
    of another file in it."""
    lines = content.split(b"\n")
    place = random.randrange(len(lines))
    line = lines[place]
    mark = next((m for m in (b";", b"\t", b"|", b",", b" ") if m in line), b";")
    cells = line.split(mark)
    cell = random.randrange(len(cells))
    token = random.choice(_TOKENS).encode()
    way = random.randrange(12)
    if way == 0:
        cells[cell] = token
    elif way == 1:
        cells.insert(cell, token)
    elif way == 2:
        del cells[cell]
    elif way == 3:
        cells[cell] += token
    elif way == 4:
        cells[cell] = b'"' + cells[cell] + b'"'
    elif way == 5:
        cells = cells * 2
    if way < 6:
        lines[place] = mark.join(cells)
    elif way == 6:
        lines.insert(place, token)
    elif way == 7:
        stop = place + random.choice((1, 1, 3, 10))
        target = random.randrange(len(lines) + 1)
        lines[target:target] = lines[place:stop]
    elif way == 8:
        del lines[place : place + random.choice((1, 1, 3, 10))]
    elif way == 9:
        theirs = other.split(b"\n")
        start = random.randrange(len(theirs))
        lines[place:place] = theirs[start : start + random.choice((1, 3, 10, 100))]
    elif way == 10:
        # A column turned into something else, all the way down.
        for i in range(place, len(lines)):
            own = lines[i].split(mark)
            if cell < len(own):
                own[cell] = token
                lines[i] = mark.join(own)
    else:
        return content.replace(mark, random.choice((b";", b"\t", b"|", b",", b"  ")))
    return b"\n".join(lines)
