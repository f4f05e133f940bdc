// Package checks holds tests of the source tree itself: which package may import which, what lies at
// the top, which licences and versions the programs are linked with, what no file may say.
package checks
