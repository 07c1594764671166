package main

import "runtime/debug"

// version is the release, which every answer carries; a build may set it with -ldflags "-X main.version=…".
var version = "0.1.0"

// fullVersion adds the toolchain and, where the build knows it, the revision.
func fullVersion() string {
	text := "guardrow " + version
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return text
	}
	for _, s := range info.Settings {
		if s.Key == "vcs.revision" {
			text += " " + s.Value
		}
	}
	return text + " " + info.GoVersion
}
