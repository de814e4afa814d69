package main

import (
	"encoding/json"
	"fmt"
	"io"
	"os"
	"path/filepath"
)

// writeJSON writes a value to a file, or to out for "-". A file that exists is
// replaced only once the new content is whole.
func writeJSON(out io.Writer, name string, value any) error {
	data, err := json.MarshalIndent(value, "", "  ")
	if err != nil {
		return err
	}
	data = append(data, '\n')
	if name == "-" {
		if _, err := out.Write(data); err != nil {
			return fmt.Errorf("writing the report to standard output: %w", err)
		}
		return nil
	}
	if err := writeFile(name, data); err != nil {
		return fmt.Errorf("writing the report: %w", err)
	}
	return nil
}

// writeFile writes a file whole or not at all; what is not a regular file, a
// pipe say, is written to as it is.
func writeFile(name string, data []byte) error {
	if info, err := os.Stat(name); err == nil && !info.Mode().IsRegular() {
		f, err := os.OpenFile(name, os.O_WRONLY, 0)
		if err != nil {
			return err
		}
		_, err = f.Write(data)
		if closed := f.Close(); err == nil {
			err = closed
		}
		return err
	}
	f, err := os.CreateTemp(filepath.Dir(name), ".brinkwell-*")
	if err != nil {
		return fmt.Errorf("%s: %w", name, err)
	}
	defer os.Remove(f.Name()) // fails once the file has its name
	_, err = f.Write(data)
	if err == nil {
		err = f.Chmod(0o644)
	}
	if closed := f.Close(); err == nil {
		err = closed
	}
	if err == nil {
		err = os.Rename(f.Name(), name)
	}
	return err
}
