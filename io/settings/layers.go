package settings

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"maps"
	"os"
	"slices"
	"strconv"
	"strings"

	"github.com/pelletier/go-toml/v2"
)

// variablePrefix begins the names of the environment variables that set keys.
const variablePrefix = "BRINKWELL_SET_"

// maxFileSize refuses what cannot be a settings file, such as a recording.
const maxFileSize = 1 << 20 // bytes

// A layer is what one source states; later layers win over earlier ones.
type layer map[string]entry

// An entry is a key's value as it was stated, and where.
type entry struct {
	key    *key
	value  any // what TOML holds, or text
	source string
}

// text is a value without TOML's quotes and types: from the environment, an
// assignment, or the table of keys.
type text string

// A problem is what is wrong with the settings, for the user to read.
type problem string

func (p problem) Error() string { return "settings: " + string(p) }

func problemf(format string, args ...any) problem { return problem(fmt.Sprintf(format, args...)) }

// wrong says what is wrong with the value of e.
func (e entry) wrong(format string, args ...any) error {
	return problemf("%s = %s (%s): %s", e.key.name, shown(e.value), e.source, fmt.Sprintf(format, args...))
}

// shown writes a value about as the user did.
func shown(value any) string {
	switch v := value.(type) {
	case text:
		return strconv.Quote(string(v))
	case string:
		return strconv.Quote(v)
	case float64:
		return bareText(v)
	case []any:
		return "[…]"
	}
	return fmt.Sprint(value)
}

// builtIn returns the built-in demo.
func builtIn() layer {
	l := layer{}
	for i, k := range keys {
		if k.value != "" {
			l[k.name] = entry{&keys[i], text(k.value), "built-in demo"}
		}
	}
	return l
}

// readFile reads a settings file.
func readFile(name string) ([]byte, error) {
	f, err := os.Open(name)
	if err != nil {
		return nil, fmt.Errorf("settings: %w", err)
	}
	defer f.Close()
	data, err := io.ReadAll(io.LimitReader(f, maxFileSize+1))
	if err != nil {
		return nil, fmt.Errorf("settings: %w", err)
	}
	if len(data) > maxFileSize {
		return nil, problemf("%s: larger than %d bytes, so not a settings file", name, maxFileSize)
	}
	return data, nil
}

// fromFile reads TOML. Keys must be spelt as they are known, letter case
// included: folding it would let two spellings of one key fight.
func fromFile(name string, data []byte) (layer, []error) {
	var table map[string]any
	if err := toml.Unmarshal(bytes.TrimPrefix(data, []byte("\ufeff")), &table); err != nil {
		var at *toml.DecodeError
		if errors.As(err, &at) {
			line, column := at.Position()
			return nil, []error{problemf("%s, line %d, column %d: %s", name, line, column,
				strings.TrimPrefix(at.Error(), "toml: "))}
		}
		return nil, []error{problemf("%s: %v", name, err)}
	}
	l := layer{}
	return l, l.add(name, "", table)
}

// add flattens a table of a file into l; section is "" for the whole file.
func (l layer) add(file, section string, table map[string]any) []error {
	var wrong []error
	for _, name := range slices.Sorted(maps.Keys(table)) {
		value := table[name]
		full := name
		if section != "" {
			full = section + "." + name
		}
		inner, isTable := value.(map[string]any)
		k := lookup(full)
		isSection := section == "" && slices.Contains(sections(), name)
		switch {
		case strings.Contains(name, "."):
			wrong = append(wrong, problemf("%q (%s): in quotes this is one name, not a path; leave the quotes out, or write %s",
				name, file, pathHint(name)))
		case isTable && isSection:
			wrong = append(wrong, l.add(file, name, inner)...)
		case isSection:
			wrong = append(wrong, problemf("%s = %s (%s): %s is a section; write [%s] and its keys below it",
				name, shown(value), file, name, name))
		case isTable && k != nil:
			wrong = append(wrong, problemf("[%s] (%s): %s is a key, not a section; write %s = …", full, file, full, full))
		case isTable && section == "":
			wrong = append(wrong, problemf("unknown section [%s] (%s); the nearest known name is [%s]",
				name, file, nearest(name, sections())))
		case k == nil:
			wrong = append(wrong, unknown(full, file))
		default:
			l[full] = entry{k, value, file}
		}
	}
	return wrong
}

// pathHint says where the key that a quoted path means belongs.
func pathHint(path string) string {
	section, name, _ := strings.Cut(nearest(path, names()), ".")
	return fmt.Sprintf("%s under [%s]", name, section)
}

func unknown(name, source string) error {
	return problemf("unknown key %s (%s); the nearest known name is %s", name, source, nearest(name, names()))
}

// fromEnvironment takes the variables that begin with variablePrefix, in any
// letter case, from a list of NAME=VALUE.
func fromEnvironment(environ []string) (layer, []error) {
	byVariable := map[string]*key{}
	for i, k := range keys {
		byVariable[k.variable()] = &keys[i]
	}
	l := layer{}
	var wrong []error
	for _, assignment := range environ {
		name, value, _ := strings.Cut(assignment, "=")
		if len(name) < len(variablePrefix) || !strings.EqualFold(name[:len(variablePrefix)], variablePrefix) {
			continue
		}
		k := byVariable[name]
		if k == nil {
			known := slices.Collect(maps.Keys(byVariable))
			slices.Sort(known)
			wrong = append(wrong, problemf("unknown environment variable %s; the nearest known name is %s",
				name, nearest(name, known)))
			continue
		}
		wrong = append(wrong, l.put(entry{k, text(value), name})...)
	}
	return l, wrong
}

// variable returns the name of the environment variable that sets the key.
func (k key) variable() string {
	return variablePrefix + strings.ToUpper(strings.ReplaceAll(k.name, ".", "_"))
}

// fromAssignments takes a list of key=value, as --set gives.
func fromAssignments(set []string) (layer, []error) {
	l := layer{}
	var wrong []error
	for _, assignment := range set {
		name, value, found := strings.Cut(assignment, "=")
		name = strings.TrimSpace(name)
		if !found {
			wrong = append(wrong, problemf("--set %q: write key=value, such as resonator.quality=50", assignment))
			continue
		}
		k := lookup(name)
		if k == nil {
			wrong = append(wrong, unknown(name, "--set"))
			continue
		}
		wrong = append(wrong, l.put(entry{k, text(strings.TrimSpace(value)), "--set"})...)
	}
	return l, wrong
}

// put adds an entry that must be the layer's first for its key.
func (l layer) put(e entry) []error {
	if first, found := l[e.key.name]; found {
		return []error{e.wrong("stated twice; before it as %s", shown(first.value))}
	}
	l[e.key.name] = e
	return nil
}

// resolveTwins lets the latest layer decide between two keys that say the same
// thing, and finds layers that state both.
func resolveTwins(layers []layer) []error {
	var wrong []error
	for i, l := range layers {
		for _, k := range keys {
			e, stated := l[k.name]
			if !stated || k.twin == "" {
				continue
			}
			if other, both := l[k.twin]; both && k.name < k.twin {
				wrong = append(wrong, problemf("%s (%s) and %s (%s) say the same thing: state one of them",
					k.name, e.source, k.twin, other.source))
			}
			for _, earlier := range layers[:i] {
				delete(earlier, k.twin)
			}
		}
	}
	return wrong
}
