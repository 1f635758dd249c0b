// Package bridgetest holds the laws that every bridge obeys. Run applies them; Broken lists what a bridge breaks, so that
// the laws themselves can be tried on bridges with mistakes in them.
//
// On random models of every kind, with every item of the bridge's kind taken across and nothing else:
//
//	sizes         lowering makes exactly what the size rule says, and a valid model
//	purity        lowering twice gives the same, and leaves the client's model alone
//	substitution  at any point of the lowered model, the objective and what was not lowered are as at the lifted point
//	adjoint       any multipliers of the images pair with them as the lifted multiplier does with the original
//	membership    where no block is new, the images hold at a point just when the original does
//	execution     with an engine at hand: solved on the far side and lifted, models with known answers give those, multipliers and certificates
//	              included, and the examiner passes them
package bridgetest
