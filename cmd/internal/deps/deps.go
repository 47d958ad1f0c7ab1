// Package deps pins dependencies until their users land.
package deps

import (
	_ "github.com/go-viper/mapstructure/v2"
	_ "github.com/sbinet/npyio/npz"
	_ "github.com/schollz/progressbar/v3"
	_ "github.com/spf13/cobra"
	_ "github.com/spf13/viper"
	_ "go.yaml.in/yaml/v3"
	_ "golang.org/x/term"
	_ "gonum.org/v1/gonum/mat"
	_ "gonum.org/v1/plot"
	_ "gonum.org/v1/plot/vg/vgsvg"
)
