package tables

import (
	"os"

	"golang.org/x/sys/unix"
)

// exchange swaps two folders in one step of the file system, so that a reader
// finds either the old or the new one at any instant.
func exchange(a, b string) error {
	return unix.Renameat2(unix.AT_FDCWD, a, unix.AT_FDCWD, b, unix.RENAME_EXCHANGE)
}

// syncDir flushes a folder's list of names to the disk.
func syncDir(dir string) error {
	d, err := os.Open(dir)
	if err != nil {
		return err
	}
	defer d.Close()
	return d.Sync()
}
