package settings

import (
	"strings"
)

// nearest returns the known name that is fewest edits from name, or those that
// tie for it, joined by " or ". Letter case does not count, and a last part
// that nearly fits makes up for a wrong section.
func nearest(name string, known []string) string {
	best := -1
	var found []string
	for _, candidate := range known {
		a, b := strings.ToLower(name), strings.ToLower(candidate)
		cost := edits(a, b)
		if last := edits(lastPart(a), lastPart(b)); 3*last <= len(lastPart(a)) {
			cost = min(cost, 1+last)
		}
		if best < 0 || cost < best {
			best, found = cost, nil
		}
		if cost == best {
			found = append(found, candidate)
		}
	}
	return strings.Join(found, " or ")
}

func lastPart(name string) string { return name[strings.LastIndexByte(name, '.')+1:] }

// edits returns the Levenshtein distance between two strings, in bytes:
// V.I. Levenshtein, Soviet Physics Doklady 10, 707 (1966), row by row.
func edits(a, b string) int {
	row := make([]int, len(b)+1)
	for j := range row {
		row[j] = j
	}
	for i := range len(a) {
		diagonal := row[0]
		row[0] = i + 1
		for j := range len(b) {
			change := diagonal
			if a[i] != b[j] {
				change++
			}
			diagonal = row[j+1]
			row[j+1] = min(change, row[j]+1, row[j+1]+1)
		}
	}
	return row[len(b)]
}
