package registry

import (
	"os/exec"
	"testing"
)

func TestEveryBackEndIsHereOrMissed(t *testing.T) {
	check := func(want map[string]bool) {
		t.Helper()
		drivers, absent := Backends()
		got := map[string]bool{}
		for _, d := range drivers {
			got[d.Sheets()[0].Backend] = true
		}
		for _, a := range absent {
			if a.Cure != "install the Debian package "+map[string]string{"csdp": "coinor-csdp", "glpk": "glpk-utils"}[a.Backend] {
				t.Errorf("%s is missed without a word that helps: %q", a.Backend, a.Cure)
			}
			got[a.Backend] = false
		}
		for name, here := range want {
			if is, known := got[name]; !known || is != here {
				t.Errorf("%s: known %v, here %v, want %v", name, known, is, here)
			}
		}
		if len(got) != len(want) {
			t.Errorf("got %v, want %v", got, want)
		}
	}
	_, noCSDP := exec.LookPath("csdp")
	_, noGLPK := exec.LookPath("glpsol")
	check(map[string]bool{"interior": true, "csdp": noCSDP == nil, "glpk": noGLPK == nil})
	t.Setenv("PATH", t.TempDir())
	check(map[string]bool{"interior": true, "csdp": false, "glpk": false})
}
