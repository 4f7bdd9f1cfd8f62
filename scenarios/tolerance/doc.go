// Package tolerance looks for the worst that one design can meet while the real
// plant's parameters stay within their tolerances.
//
// Every case is a real plant beside the design's model: separation no longer
// holds, so plant and estimator are judged together (estimator.Designer.Against).
// The cases are the nominal plant, the corners of the tolerance box and seeded
// points inside it. A figure need not be worst at a corner, nor at a point that
// was tried: what is found is a lower bound of the true worst case, never a proof
// that nothing is worse.
package tolerance

// Caution goes with every envelope.
const Caution = "The worst of the cases that were tried: the real worst within the tolerances can be worse still."
