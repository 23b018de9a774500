//go:build !unix

package notify

import "io/fs"

// othersMay is no permission bits: elsewhere they say nothing about who may read.
func othersMay(fs.FileInfo, bool) fs.FileMode { return 0 }
