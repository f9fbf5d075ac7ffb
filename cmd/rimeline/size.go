package main

import (
	"bufio"
	"fmt"
	"io"
	"os"

	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/sizing/working"
)

// sizeFile is the command "size": it prints one result, or one refusal, a line for
// each design in the file.
func sizeFile(args []string, stdin io.Reader, stdout, stderr io.Writer) int {
	if len(args) != 1 || isFlag(args[0]) {
		fmt.Fprintln(stderr, `rimeline: size takes one file, or "-" for standard input: rimeline size FILE`)
		return exitRefused
	}
	input, err := readInput(args[0], stdin)
	if err != nil {
		fmt.Fprintln(stderr, "rimeline:", err)
		return exitRefused
	}
	out := bufio.NewWriter(stdout)
	status := exitFits
	for i, doc := range design.ReadAll(input) {
		line, one := sizeDocument(i+1, doc)
		status = max(status, one)
		_, _ = out.Write(line) // Flush tells
		if one == exitRefused {
			_, _ = stderr.Write(line)
		}
	}
	if err := out.Flush(); err != nil {
		fmt.Fprintln(stderr, "rimeline: the results could not be written:", err)
		return exitRefused
	}
	return status
}

func readInput(name string, stdin io.Reader) ([]byte, error) {
	if name == "-" {
		return io.ReadAll(stdin)
	}
	return os.ReadFile(name)
}

// sizeDocument returns the line that answers the k-th document of an input, counted
// from 1, and the exit status that it asks for.
func sizeDocument(k int, doc design.Document) ([]byte, int) {
	if doc.Design == nil {
		return append(design.AppendRefusal(nil, k, doc.Faults), '\n'), exitRefused
	}
	result := sizing.Size(doc.Design)
	status := exitFits
	if result.Verdict >= working.Unconfirmed {
		status = exitDoubt
	}
	return append(result.AppendJSON(nil), '\n'), status
}
