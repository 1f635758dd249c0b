// Package proto holds the wire contract, towpath/v1, and its generated Go.
//
// Generation is one command, run here after "npm ci":
//
//	go generate ./proto
package proto

//go:generate npx buf generate
