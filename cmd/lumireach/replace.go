package main

import (
	"bufio"
	"fmt"
	"io"
	"os"
	"path/filepath"
)

// replace writes a file whole or not at all: to a temporary neighbour first,
// which then takes its name.
func replace(path string, write func(io.Writer) error) (err error) {
	if info, err := os.Stat(path); err == nil && info.IsDir() {
		return usagef("--out %s is a directory, must be a file", path)
	}
	file, err := os.CreateTemp(filepath.Dir(path), "."+filepath.Base(path)+"-*")
	if err != nil {
		return fmt.Errorf("cannot write %s: %w", path, err)
	}
	defer func() {
		if err != nil {
			file.Close()
			os.Remove(file.Name())
		}
	}()
	buffer := bufio.NewWriter(file)
	if err := write(buffer); err != nil {
		return err
	}
	if err := buffer.Flush(); err != nil {
		return fmt.Errorf("cannot write %s: %w", path, err)
	}
	if err := file.Chmod(0o644); err != nil {
		return fmt.Errorf("cannot write %s: %w", path, err)
	}
	if err := file.Sync(); err != nil {
		return fmt.Errorf("cannot write %s: %w", path, err)
	}
	if err := file.Close(); err != nil {
		return fmt.Errorf("cannot write %s: %w", path, err)
	}
	if err := os.Rename(file.Name(), path); err != nil {
		return fmt.Errorf("cannot write %s: %w", path, err)
	}
	return nil
}
