// Package endtoend has tests only: published instances go through gRPC down every route, and the answers that come back
// are compared with what the literature says of values, multipliers, primal points and certificates.
package endtoend
