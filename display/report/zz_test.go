package report
import ("testing";"bytes";"os")
func TestZZ(t *testing.T){
 r:=darkRecord(t); first:=render(t,r,Options{})
 for i:=0;i<40;i++{ b:=render(t,r,Options{}); if !bytes.Equal(b,first){ os.WriteFile("/tmp/look/a.pdf",first,0o644); os.WriteFile("/tmp/look/b.pdf",b,0o644); t.Fatal("differs",i)} }
}
