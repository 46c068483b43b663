package main

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
)

// output is a file in the making, or standard output. Files are written beside
// their place under another name and renamed at the end, so that nobody ever
// sees a part of one.
type output struct {
	*bufio.Writer
	path string
	file *os.File // nil for standard output
}

// outputs are the records, the truth and the exposure; nil where not asked
// for.
type outputs []*output

// openOutputs opens an output for each path ("" for none, "-" for standard
// output). It refuses two outputs in one place and, unless force is set, a
// file that exists.
func openOutputs(out io.Writer, force bool, paths ...string) (outputs, error) {
	opened := make(outputs, len(paths))
	taken := map[string]bool{}
	for i, path := range paths {
		if path == "" {
			continue
		}
		place := path
		if path != "-" {
			place = filepath.Clean(path)
		}
		if taken[place] {
			opened.discard()
			return nil, &usageError{fmt.Errorf("two outputs go to %q", path)}
		}
		taken[place] = true
		o, err := openOutput(out, force, path)
		if err != nil {
			opened.discard()
			return nil, err
		}
		opened[i] = o
	}
	return opened, nil
}

func openOutput(out io.Writer, force bool, path string) (*output, error) {
	if path == "-" {
		return &output{Writer: bufio.NewWriterSize(out, 1<<16), path: path}, nil
	}
	if info, err := os.Stat(path); err == nil && (!force || !info.Mode().IsRegular()) {
		return nil, fmt.Errorf("write %q: %w", path, os.ErrExist)
	}
	f, err := os.CreateTemp(filepath.Dir(path), "."+filepath.Base(path)+".*")
	if err != nil {
		return nil, fmt.Errorf("write %q: %w", path, err)
	}
	return &output{Writer: bufio.NewWriterSize(f, 1<<16), path: path, file: f}, nil
}

// keep finishes every output: first all are written out, then all are renamed,
// so that a full disk leaves what was there before.
func (list outputs) keep() error {
	for _, o := range list {
		if o == nil {
			continue
		}
		err := o.Flush()
		if o.file != nil {
			err = errors.Join(err, o.file.Chmod(0o644), o.file.Sync(), o.file.Close())
		}
		if err != nil {
			return fmt.Errorf("write %q: %w", o.path, err)
		}
	}
	for _, o := range list {
		if o == nil || o.file == nil {
			continue
		}
		if err := os.Rename(o.file.Name(), o.path); err != nil {
			return fmt.Errorf("write %q: %w", o.path, err)
		}
		o.file = nil
	}
	return nil
}

// discard removes what has not been kept.
func (list outputs) discard() {
	for _, o := range list {
		if o != nil && o.file != nil {
			o.file.Close()
			os.Remove(o.file.Name())
		}
	}
}
