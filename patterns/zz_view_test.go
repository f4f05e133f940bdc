package patterns

import (
	"fmt"
	"os"
	"testing"
)

func TestView(t *testing.T) {
	dir := os.Getenv("VIEWDIR")
	if dir == "" {
		t.Skip()
	}
	for _, sz := range [][3]int{{800, 600, 8}, {1920, 1080, 8}, {1536, 2048, 10}} {
		for _, in := range List() {
			s := Spec{Width: sz[0], Height: sz[1], Bits: sz[2]}
			if in.Name == "places" && sz[0] != 1920 {
				s.Places = 25
			}
			if in.Name == "motion" {
				s.Frame = 77
			}
			p, err := DrawRGB(in.Name, s)
			if err != nil {
				t.Error(err)
				continue
			}
			f, _ := os.Create(fmt.Sprintf("%s/%s-%d.png", dir, in.Name, sz[0]))
			if err := p.WritePNG(f); err != nil {
				t.Error(err)
			}
			f.Close()
		}
	}
}
