"""Prints the video table of an ICC profile as the little-cms library (2.x) reads it: one line an input of 0 to
255, with the 16-bit outputs of red, green and blue. Usage: python3 videotable.py PROFILE"""

import ctypes
import ctypes.util
import sys

name = ctypes.util.find_library("lcms2") or "liblcms2.so.2"
try:
    lcms = ctypes.CDLL(name)
except OSError:
    sys.exit(3)  # the library is missing
lcms.cmsOpenProfileFromFile.restype = ctypes.c_void_p
lcms.cmsOpenProfileFromFile.argtypes = [ctypes.c_char_p, ctypes.c_char_p]
lcms.cmsReadTag.restype = ctypes.POINTER(ctypes.c_void_p)
lcms.cmsReadTag.argtypes = [ctypes.c_void_p, ctypes.c_uint32]
lcms.cmsEvalToneCurve16.restype = ctypes.c_uint16
lcms.cmsEvalToneCurve16.argtypes = [ctypes.c_void_p, ctypes.c_uint16]

profile = lcms.cmsOpenProfileFromFile(sys.argv[1].encode(), b"r")
if not profile:
    sys.exit("the library opens no profile")
curves = lcms.cmsReadTag(profile, int.from_bytes(b"vcgt", "big"))
if not curves:
    sys.exit("the library finds no video table")
for i in range(256):
    print(*(lcms.cmsEvalToneCurve16(curves[k], i * 257) for k in range(3)))
