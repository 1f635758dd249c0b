package wire

import towpathv1 "towpath/proto/towpath/v1"

// NumbersFromProto decodes a list of numbers in any of its three forms, for who reads an answer without its model. The
// result must not be changed: it may share memory with the message.
func NumbersFromProto(n *towpathv1.Numbers) ([]complex128, error) {
	return numbersFromProto(n, "numbers", "the numbers")
}
