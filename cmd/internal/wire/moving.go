package wire

type movingMode struct{}
