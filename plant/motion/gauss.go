package motion

import "gonum.org/v1/gonum/integrate/quad"

// gauss holds the nodes and weights of Gauss-Legendre integration over (0, 1).
// Over a step of length short its error for the products of two solutions is
// below 1e-16 of the result.
var gauss = func() (rule struct{ node, weight [12]float64 }) {
	quad.Legendre{}.FixedLocations(rule.node[:], rule.weight[:], 0, 1)
	return rule
}()
