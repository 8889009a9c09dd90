"""Float WAV files in and out in numpy alone, so that no other library's reading is trusted."""

import struct

import numpy as np


def write_wav(path, samples, rate):
    """32-bit float, one channel (1-D) or several (frames by channels)."""
    data = np.asarray(samples, np.float32)
    data = data[:, None] if data.ndim == 1 else data
    body = data.astype("<f4").tobytes()
    channels = data.shape[1]
    head = struct.pack("<HHIIHHH", 3, channels, rate, rate * channels * 4, channels * 4, 32, 0)
    fact = struct.pack("<I", data.shape[0])
    chunks = b"fmt " + struct.pack("<I", len(head)) + head + b"fact" + struct.pack("<I", 4) + fact
    chunks += b"data" + struct.pack("<I", len(body)) + body
    with open(path, "wb") as file:
        file.write(b"RIFF" + struct.pack("<I", 4 + len(chunks)) + b"WAVE" + chunks)


def read_wav(path):
    """(samples as float64, frames by channels; rate) of a float WAV."""
    with open(path, "rb") as file:
        data = file.read()
    if data[:4] != b"RIFF" or data[8:12] != b"WAVE":
        raise ValueError(f"{path}: not a WAV file")
    at, form = 12, None
    while at + 8 <= len(data):
        name, size = data[at:at + 4], struct.unpack("<I", data[at + 4:at + 8])[0]
        body = data[at + 8:at + 8 + size]
        if name == b"fmt ":
            form = struct.unpack("<HHIIHH", body[:16])
            code = struct.unpack("<H", body[24:26])[0] if form[0] == 0xFFFE else form[0]
        elif name == b"data":
            if code != 3 or form[5] not in (32, 64):
                raise ValueError(f"{path}: format {code} of {form[5]} bits is not float")
            kind = "<f4" if form[5] == 32 else "<f8"
            return np.frombuffer(body, kind).astype(float).reshape(-1, form[1]), form[2]
        at += 8 + size + (size & 1)
    raise ValueError(f"{path}: no sound in it")
