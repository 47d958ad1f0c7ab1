// Command nullmark computes waveforms and fluxes of a small mass around a black
// hole at null infinity and at the horizon, each number with an error bar.
package main

import (
	"context"
	"os"

	"nullmark/cmd/internal/app"
	"nullmark/cmd/internal/wire"
)

func main() {
	os.Exit(app.Run(context.Background(), engine(), os.Args[1:], os.Stdout, os.Stderr))
}

func engine() app.Engine {
	return app.Engine{Checks: wire.Checks, Warnings: wire.Warnings, Plan: wire.MakePlan, Run: wire.Run,
		CanAsk: wire.CanAsk, SecondOpinion: wire.SecondOpinion}
}
