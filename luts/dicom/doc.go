// Package dicom reads grayscale images from DICOM files (PS3.10) and writes two kinds of object: a
// Secondary Capture that holds a test pattern, and a Grayscale Softcopy Presentation State that names an
// image and says how to show it.
//
// Read walks the data elements (PS3.5 clause 7), keeps what the grayscale stages need (PS3.3 C.7.6.3,
// C.11) and leaves everything else in the file: pixels and frame-wise stages are read when asked for, so
// the file must stay open as long as the Image is used. An Image may be used by several goroutines at once.
//
// Transfer syntaxes: implicit and explicit little endian, explicit big endian, deflated, RLE lossless, JPEG
// lossless (process 14, any selection value) and JPEG baseline. Every other is refused by its name.
//
// What it never does: it keeps nothing that identifies a patient, neither in the Image nor in a notice nor
// in an error (the image's own identifiers come only through Image.Reference). It draws no overlay, decodes
// no colour, and does not look for text burned into the pixels: no program can promise to see that.
//
// Files are taken to be hostile. Every length is checked against what holds it before anything is
// allocated; nesting ends at 32 levels, a frame at 2^27 pixel cells, a deflated data set at 64 MiB or 32
// times the file. Besides buffers of 128 KiB, Read allocates at most 12 times the file. Frame allocates 2
// bytes for each pixel cell, and the compressed frame itself, and refuses a frame with more cells than its
// bytes can hold: that is at most 2 times the file without compression (deflated: of the inflated data
// set), 132 times for RLE, 20 times for JPEG lossless and 800 times for JPEG baseline.
package dicom
