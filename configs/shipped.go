package configs

import (
	"embed"
	"fmt"
	"io/fs"
)

//go:embed *.yaml
var shipped embed.FS

// Shipped lists the file names of the cases that come with the tool, sorted.
func Shipped() []string {
	names, err := fs.Glob(shipped, "*.yaml")
	if err != nil {
		panic("configs: " + err.Error())
	}
	return names
}

// ShippedFile returns the text of a shipped case by its name. The slice is the
// caller's.
func ShippedFile(name string) ([]byte, error) {
	data, err := shipped.ReadFile(name)
	if err != nil {
		return nil, fmt.Errorf("no shipped case is called %s: %w", name, err)
	}
	return data, nil
}
