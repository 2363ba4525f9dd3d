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
