package main

import (
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
interrupted. It prints the rig file that reads them; --json prints the addresses.`,
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
			if pty {
				for _, name := range simbench.Names() {
					path, err := bench.ServePTY(name)
					if err != nil {
						return err
					}
					a.progress("%s also answers on serial://%s", name, path)
				}
			}
			if a.json {
				err = a.printJSON(map[string]any{"addresses": bench.Addresses()})
			} else {
				err = a.say("%s", bench.RigTOML())
			}
			if err != nil {
				return err
			}
			a.progress("The bench is being served; Ctrl-C ends it.")
			<-ctx.Done()
			return nil
		},
	}
	f := cmd.Flags()
	f.Var(&bus, "bus-v", "bus voltage the supply starts with")
	f.Var(&load, "current-a", "load current")
	f.Uint64Var(&cfg.Seed, "seed", cfg.Seed, "seed of the instruments' noise")
	f.BoolVar(&pty, "pty", false, "serve each instrument on a pseudo-terminal too")
	return cmd
}
