package app

import (
	"fmt"
	"runtime"
	"runtime/debug"
)

// version says which build this is: version, commit, Go and platform, as far
// as the build has recorded them.
func version() string {
	info, _ := debug.ReadBuildInfo()
	return describe(info)
}

func describe(info *debug.BuildInfo) string {
	number, commit, changed := "unversioned", "unknown", ""
	if info != nil {
		if v := info.Main.Version; v != "" {
			number = v
		}
		for _, s := range info.Settings {
			switch {
			case s.Key == "vcs.revision":
				commit = s.Value[:min(12, len(s.Value))]
			case s.Key == "vcs.modified" && s.Value == "true":
				changed = ", changed since"
			}
		}
	}
	return fmt.Sprintf("%s (commit %s%s, %s, %s/%s)", number, commit, changed, runtime.Version(), runtime.GOOS, runtime.GOARCH)
}
