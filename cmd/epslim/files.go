package main

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
)

// write puts a file in place in one step: it is written to a temporary name
// beside its target and renamed. An existing file is kept unless force is
// set.
func write(name string, data []byte, force bool) (err error) {
	if !force {
		if err := vacant(name); err != nil {
			return err
		}
	}
	f, err := os.CreateTemp(filepath.Dir(name), "."+filepath.Base(name)+".*")
	if err != nil {
		return err
	}
	defer func() {
		if err != nil {
			f.Close()
			os.Remove(f.Name())
		}
	}()
	if _, err = f.Write(data); err != nil {
		return err
	}
	if err = f.Chmod(0o644); err != nil {
		return err
	}
	if err = f.Close(); err != nil {
		return err
	}
	return os.Rename(f.Name(), name)
}

// vacant complains when a file exists.
func vacant(name string) error {
	_, err := os.Lstat(name)
	switch {
	case err == nil:
		return fmt.Errorf("%s exists; use --force to replace it", name)
	case errors.Is(err, fs.ErrNotExist):
		return nil
	}
	return err
}
