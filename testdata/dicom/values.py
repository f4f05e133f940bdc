# Prints what pydicom reads, one JSON object a line, as the outside view for the tests of luts/dicom.
#
#   values.py          every file of the test data that come with pydicom
#   values.py FILE...  these files
#
# "sha256" is that of the stored values of all frames as 32-bit little endian integers: the bits that
# Bits Stored and High Bit name, sign extended where Pixel Representation is 1 (DICOM PS3.5 8.1). It is
# null where pydicom cannot decode the pixels, with the reason in "reason".

import hashlib
import json
import os
import sys
import warnings

import numpy
import pydicom

warnings.simplefilter("ignore")


def number(value):
    return None if value is None or value == "" else float(value)


def numbers(value):
    if value is None or value == "":
        return []
    if isinstance(value, (str, int, float)):
        value = [value]
    return [float(v) for v in value]


def lut(item):
    descriptor = [int(v) for v in item.LUTDescriptor]
    data = item.LUTData
    if isinstance(data, bytes):
        data = numpy.frombuffer(data, "<u2" if item.is_little_endian in (True, None) else ">u2").tolist()
    return {"descriptor": descriptor, "data": [int(v) for v in data]}


def values(path):
    line = {"file": path, "image": False}
    try:
        d = pydicom.dcmread(path, force=True)
        if "Rows" not in d or "PixelData" not in d:
            return line
    except Exception as e:
        line["reason"] = type(e).__name__
        return line
    meta = getattr(d, "file_meta", {})
    syntax = meta.get("TransferSyntaxUID") if meta else None
    line.update(
        image=True,
        syntax=str(syntax) if syntax else "",
        name=syntax.name if syntax else "",
        rows=d.Rows,
        columns=d.Columns,
        photometric=d.PhotometricInterpretation,
        allocated=d.BitsAllocated,
        stored=d.BitsStored,
        signed=d.PixelRepresentation == 1,
        slope=number(d.get("RescaleSlope")),
        intercept=number(d.get("RescaleIntercept")),
        centers=numbers(d.get("WindowCenter")),
        widths=numbers(d.get("WindowWidth")),
        function=d.get("VOILUTFunction") or "",
        voi=[lut(i) for i in d.get("VOILUTSequence", [])],
        modality=d.get("Modality") or "",
        sha256=None,
    )
    try:
        line["frames"] = int(d.get("NumberOfFrames") or 1)
        cells = d.pixel_array.astype(numpy.int64)
        v = (cells >> (d.HighBit + 1 - d.BitsStored)) & ((1 << d.BitsStored) - 1)
        if d.PixelRepresentation == 1:
            v = v - ((v >> (d.BitsStored - 1)) << d.BitsStored)
        line["sha256"] = hashlib.sha256(v.astype("<i4").tobytes()).hexdigest()
        line["low"], line["high"] = int(v.min()), int(v.max())
    except Exception as e:
        line["reason"] = type(e).__name__ + ": " + str(e).split("\n")[0]
    return line


paths = sys.argv[1:]
if not paths:
    data = os.path.join(os.path.dirname(pydicom.__file__), "data")
    for folder, _, names in sorted(os.walk(data)):
        paths += [os.path.join(folder, n) for n in sorted(names) if not n.endswith((".py", ".pyc"))]
for path in paths:
    print(json.dumps(values(path)))
