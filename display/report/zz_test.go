package report
import ("testing";"time")
func TestZZ(t *testing.T){
 m,_:=newRuler()
 for n,r:=range samples(t){ for pn,p:=range papers { for i,tt:=range tightness {
  s:=&sheet{ruler:m,tight:tt,paper:p}; b:=newBody(r,time.Now(),false); s.top=b.runningHead; s.turn()
  b.head(s); b.verdict(s); b.identity(s); b.findings(s); b.unassessed(s); b.charts(s); b.causes(s); b.figures(s); b.places(s); b.notes(s)
  before:=len(s.pages); y:=s.y; b.close(s)
  t.Log(n,pn,i,"pages",before,"y",int(y),"of",int(s.bottom()),"after close",len(s.pages))
 }}}
}
