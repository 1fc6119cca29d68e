package main

import (
	"encoding/json"
	"errors"
	"io"
	"os/exec"
	"strings"
	"testing"
)

// dataFlow lists the packages in the order of the data: a package may import only what stands before it.
var dataFlow = []string{
	"measure/quantity", "measure", "measure/meter", "measure/scope", "measure/thermal", "measure/locate",
	"knowledge", "diagnose/belief", "diagnose/circuit", "diagnose/stress", "diagnose/safety", "diagnose",
	"diagnose/rebuild", "reports", "cmd/drivemend/internal/ask/quiet", "cmd/drivemend/internal/ask", "cmd/drivemend",
}

// leaves import nothing of the module.
var leaves = map[string]bool{"measure/quantity": true, "diagnose/belief": true, "diagnose/circuit": true}

// instruments stand side by side.
var instruments = map[string]bool{"measure/meter": true, "measure/scope": true, "measure/thermal": true, "measure/locate": true}

func placeInFlow(pkg string) int {
	for i, p := range dataFlow {
		if p == pkg {
			return i
		}
	}
	return -1
}

// againstTheFlow says why one package must not import another, "" when it may.
func againstTheFlow(from, to string) string {
	switch {
	case placeInFlow(from) < 0:
		return "package " + from + " has no place in the flow: add it to dataFlow"
	case placeInFlow(to) >= placeInFlow(from):
		return from + " stands before " + to
	case leaves[from]:
		return from + " is a leaf"
	case instruments[from] && instruments[to]:
		return "instruments stand side by side"
	}
	return ""
}

func TestImportsFollowTheData(t *testing.T) {
	out, err := exec.Command("go", "list", "-json=ImportPath,Imports", "drivemend/...").Output()
	if err != nil {
		t.Fatalf("go list: %v", err)
	}
	dec, packages := json.NewDecoder(strings.NewReader(string(out))), 0
	for {
		var p struct {
			ImportPath string
			Imports    []string
		}
		if err := dec.Decode(&p); errors.Is(err, io.EOF) {
			break
		} else if err != nil {
			t.Fatal(err)
		}
		packages++
		from := strings.TrimPrefix(p.ImportPath, "drivemend/")
		if placeInFlow(from) < 0 {
			t.Errorf("package %s has no place in the flow: add it to dataFlow", from)
		}
		for _, im := range p.Imports {
			if to, ok := strings.CutPrefix(im, "drivemend/"); ok {
				if why := againstTheFlow(from, to); why != "" {
					t.Errorf("%s imports %s: %s", from, to, why)
				}
			}
		}
	}
	if packages < 8 {
		t.Fatalf("only %d packages seen", packages)
	}
}

func TestFlowRulesReject(t *testing.T) {
	for _, c := range [][2]string{
		{"measure", "knowledge"}, {"diagnose/belief", "measure/quantity"}, {"knowledge", "diagnose"},
		{"measure/scope", "measure/thermal"}, {"reports", "cmd/drivemend"}, {"util", "measure"},
	} {
		if againstTheFlow(c[0], c[1]) == "" {
			t.Errorf("%s importing %s is let through", c[0], c[1])
		}
	}
	if why := againstTheFlow("diagnose", "diagnose/belief"); why != "" {
		t.Errorf("diagnose importing diagnose/belief: %s", why)
	}
}
