// Package towpathv1 is the wire contract in Go, generated from the .proto files beside it, which carry its documentation.
package towpathv1
