package work

import (
	"bufio"
	"cmp"
	"encoding/hex"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"time"

	"github.com/google/renameio/v2"

	"nightwright/constraints"
)

// Windows of large surveys are kept between runs, in the user's cache folder,
// under the SHA-256 of what they depend on. The files may be deleted at any time,
// and a store that can't be read or written is done without.

const (
	storeLeast = 4 << 20 // bytes of windows that are worth keeping
	storeMost  = 4       // files kept, the last used ones
	storeFile  = ".windows"
)

// windowStore is the folder of the stores; "": there is none.
func windowStore() string {
	dir, err := os.UserCacheDir()
	if err != nil {
		return ""
	}
	return filepath.Join(dir, "nightwright")
}

// storedWindows takes a survey's windows out of the store; nil: they aren't
// there.
func (s *Survey) storedWindows(key [32]byte, o Options) *constraints.Windows {
	dir := windowStore()
	if dir == "" {
		return nil
	}
	name := filepath.Join(dir, hex.EncodeToString(key[:])+storeFile)
	data, err := os.ReadFile(name)
	if err != nil {
		return nil
	}
	w, err := constraints.ReadWindows(data, key, s.Survey, s.Calendar, o.Workers)
	if err != nil {
		os.Remove(name) // damaged: it is written anew
		return nil
	}
	now := time.Now()
	os.Chtimes(name, now, now) // used: the last to go
	return w
}

// storeWindows keeps windows for the next run.
func (s *Survey) storeWindows(key [32]byte) {
	dir := windowStore()
	if dir == "" || s.Windows.Bytes() < storeLeast || os.MkdirAll(dir, 0o755) != nil {
		return
	}
	f, err := renameio.NewPendingFile(filepath.Join(dir, hex.EncodeToString(key[:])+storeFile), renameio.WithPermissions(0o644))
	if err != nil {
		return
	}
	defer f.Cleanup()
	b := bufio.NewWriterSize(f, 1<<20)
	if s.Windows.Store(b, key) != nil || b.Flush() != nil || f.CloseAtomicallyReplace() != nil {
		return
	}
	pruneStore(dir)
}

// pruneStore deletes all but the stores used last.
func pruneStore(dir string) {
	entries, err := os.ReadDir(dir)
	if err != nil {
		return
	}
	var files []os.FileInfo
	for _, e := range entries {
		if info, err := e.Info(); err == nil && info.Mode().IsRegular() && strings.HasSuffix(e.Name(), storeFile) {
			files = append(files, info)
		}
	}
	slices.SortFunc(files, func(a, b os.FileInfo) int {
		return cmp.Or(b.ModTime().Compare(a.ModTime()), strings.Compare(a.Name(), b.Name()))
	})
	for _, f := range files[min(storeMost, len(files)):] {
		os.Remove(filepath.Join(dir, f.Name()))
	}
}
