package main

import (
	"fmt"
	"io"
	"strings"

	"ringbook/acquire/simbench"
	"ringbook/snubber/quantity"

	"github.com/spf13/cobra"
)

func benchCommand(a *app) *cobra.Command {
	return group("bench", "The simulated bench", `  ringbook bench serve > rig.toml`, benchServe(a))
}

func benchServe(a *app) *cobra.Command {
	cfg := simbench.Default()
	var bus quantity.Volt
	var load quantity.Ampere
	var pty bool
	cmd := &cobra.Command{
		Use:   "serve",
		Short: "Serve the simulated bench alone, for trying a rig file",
		Long: `serve runs a board and its instruments made of software, on ports of the loopback interface, until it is
interrupted. It prints the rig file that reads them; --json prints the addresses.

The board's parasitics and each capacitor's true value are hidden: find them as on a real board.`,
		Example: `  ringbook bench serve > rig.toml &
  ringbook trial take --board tried --revision 1 --network bare --rig rig.toml`,
		Args: words(0, 0),
		RunE: func(cmd *cobra.Command, args []string) error {
			ctx := cmd.Context()
			if bus != 0 {
				cfg.BusV = float64(bus)
			}
			if load != 0 {
				cfg.LoadA = float64(load)
			}
			bench, err := simbench.Start(ctx, cfg)
			if err != nil {
				return err
			}
			defer bench.Close()
			rig, ports := bench.RigTOML(), map[string]string{}
			if pty {
				if ports, err = terminals(bench); err != nil {
					return err
				}
				for name, port := range ports {
					rig = strings.ReplaceAll(rig, `"`+bench.Address(name)+`"`, `"`+port+`"`)
				}
			}
			if a.json {
				err = a.printJSON(map[string]any{"addresses": bench.Addresses(), "serial": ports})
			} else {
				_, err = io.WriteString(a.stdout, rig)
			}
			if err != nil {
				return fmt.Errorf("writing the rig file: %w", err)
			}
			a.progress("The bench is being served; Ctrl-C ends it.")
			<-ctx.Done()
			return nil
		},
	}
	f := cmd.Flags()
	f.Var(&bus, "bus-v", "bus voltage the supply starts with")
	f.Var(&load, "current-a", "load current")
	f.Uint64Var(&cfg.Seed, "seed", cfg.Seed, "`NUMBER` that starts the instruments' noise")
	f.BoolVar(&pty, "pty", false, "serve each instrument as a serial port too, and name those in the rig file")
	return cmd
}

// terminals serves every instrument on a pseudo-terminal and gives the serial addresses.
func terminals(bench *simbench.Bench) (map[string]string, error) {
	ports := map[string]string{}
	for _, name := range simbench.Names() {
		path, err := bench.ServePTY(name)
		if err != nil {
			return nil, err
		}
		ports[name] = "serial://" + path
	}
	return ports, nil
}
