package main

import (
	"encoding/json"
	"errors"
	"io"
	"os/exec"
	"strings"
	"testing"
)

// leaves import nothing of ours, and anyone may import them.
var leaves = map[string]bool{
	"brinkwell/controller/trace":    true,
	"brinkwell/controller/estimate": true,
	"brinkwell/plant/motion":        true,
}

// allowed says which of our packages a package may import, by the first parts
// of its path: the most specific entry holds.
var allowed = []struct {
	path string
	may  []string
}{
	{"brinkwell/controller/trial", []string{"brinkwell/controller", "brinkwell/plant"}},
	{"brinkwell/controller/survey", []string{"brinkwell/controller", "brinkwell/plant"}},
	{"brinkwell/controller", []string{"brinkwell/controller"}},
	{"brinkwell/plant", []string{"brinkwell/plant"}},
	{"brinkwell/io", []string{"brinkwell/controller", "brinkwell/plant"}},
	{"brinkwell/cmd", []string{"brinkwell"}},
}

func under(path, root string) bool { return path == root || strings.HasPrefix(path, root+"/") }

// forbidden says why a package may not import another, or nothing.
func forbidden(from, to string) string {
	switch {
	case under(to, "brinkwell/cmd"):
		return "nothing imports a command"
	case leaves[from]:
		return "a leaf imports nothing of ours"
	case leaves[to]:
		return ""
	}
	for _, rule := range allowed {
		if !under(from, rule.path) {
			continue
		}
		for _, may := range rule.may {
			if under(to, may) {
				return ""
			}
		}
		return "it may import " + strings.Join(rule.may, ", ") + " and the leaves"
	}
	return "no rule covers this package: add one"
}

// The house's import directions hold, in the packages as in their tests.
func TestImportDirections(t *testing.T) {
	list := exec.Command("go", "list", "-json=ImportPath,Imports,XTestImports,TestImports,Dir,GoFiles", "brinkwell/...")
	out, err := list.Output()
	if err != nil {
		t.Fatalf("go list: %v", err)
	}
	dec := json.NewDecoder(strings.NewReader(string(out)))
	packages := 0
	for {
		var p struct {
			ImportPath                    string
			Imports, TestImports, GoFiles []string
		}
		if err := dec.Decode(&p); errors.Is(err, io.EOF) {
			break
		} else if err != nil {
			t.Fatal(err)
		}
		packages++
		if p.ImportPath == "brinkwell/io" {
			t.Error("brinkwell/io holds Go files: its name would hide the standard library's")
		}
		// External test packages may look at a package from anywhere.
		for _, to := range append(p.Imports, p.TestImports...) {
			if !under(to, "brinkwell") {
				continue
			}
			if why := forbidden(p.ImportPath, to); why != "" {
				t.Errorf("%s imports %s: %s", p.ImportPath, to, why)
			}
		}
	}
	if packages < 10 {
		t.Errorf("go list shows %d packages, want the whole house", packages)
	}
}

// The rule itself: what it must refuse and allow.
func TestForbidden(t *testing.T) {
	for _, tt := range []struct {
		from, to string
		ok       bool
	}{
		{"brinkwell/controller/trace", "brinkwell/plant/motion", false},
		{"brinkwell/controller/effect", "brinkwell/plant/motion", true},
		{"brinkwell/controller/effect", "brinkwell/plant", false},
		{"brinkwell/controller", "brinkwell/io/settings", false},
		{"brinkwell/controller/trial", "brinkwell/plant", true},
		{"brinkwell/plant", "brinkwell/controller/trace", true},
		{"brinkwell/plant", "brinkwell/controller/effect", false},
		{"brinkwell/io/draw", "brinkwell/controller/trial", true},
		{"brinkwell/io/draw", "brinkwell/io/settings", false},
		{"brinkwell/cmd/brinkwell", "brinkwell/io/settings", true},
		{"brinkwell/io/draw", "brinkwell/cmd/brinkwell", false},
		{"brinkwell/other", "brinkwell/plant", false},
	} {
		if why := forbidden(tt.from, tt.to); (why == "") != tt.ok {
			t.Errorf("%s importing %s: %q, want allowed: %v", tt.from, tt.to, why, tt.ok)
		}
	}
}
