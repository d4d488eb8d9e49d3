package main

import (
	"errors"
	"fmt"
	"io"
	"os"
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
	discharge := quantity.Second(cfg.Bus.DischargeS)
	var pty bool
	var drawer string
	cmd := &cobra.Command{
		Use:   "serve",
		Short: "Serve the simulated bench alone, for trying a rig file",
		Long: `serve runs a board and its instruments made of software, on ports of the loopback interface, until it is
interrupted. It prints the rig file that reads them; --json prints the addresses, and the capacitors of the relays.

The board's parasitics and each capacitor's true value are hidden: find them as on a real board. With the supply's
output off the bus discharges slowly; a part that is changed while it is live is counted as a mistake, which
FIXTure:MISTakes? at the fixture tells. A card of relays switches capacitors in; --drawer lists them in a file.
At the address that the rig file's first lines give, things go wrong on demand:

  TROuble:DROP NAME[,n[,seconds]]    its connections end now, or at message n; none is taken for so long
  TROuble:SILence NAME,seconds[,n]   it hears nothing for so long, from now or message n
  TROuble:DELay NAME,seconds[,n]     reply n, 1 being the next, comes so much later
  TROuble:CUT NAME[,n]               reply n ends in its middle; TROuble:CUT:BLOCk counts blocks alone
  TROuble:GARBage NAME[,n]           bytes that mean nothing come in place of reply n
  TROuble:LINE NAME,'text'[,n]       a line nobody asked for comes now, or before reply n
  TROuble:STALe NAME[,n]             reply n comes with the one after it
  TROuble:ERRor NAME,code[,'text']   its error queue gets an entry
  TROuble:CLEar                      what has not happened yet will not`,
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
			cfg.Bus.DischargeS = float64(discharge)
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
			if drawer != "" {
				if err := writeNew(drawer, bench.DrawerTOML()); err != nil {
					return fmt.Errorf("writing the drawer file: %w", err)
				}
			}
			if a.json {
				err = a.printJSON(map[string]any{"addresses": bench.Addresses(), "serial": ports, "relays_f": bench.Relays()})
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
	f.Var(&discharge, "discharge", "time constant with which the bus discharges while the supply's output is off")
	f.StringVar(&drawer, "drawer", "", "write the relay card's capacitors to this drawer `FILE`")
	f.Uint64Var(&cfg.Seed, "seed", cfg.Seed, "`NUMBER` that starts the instruments' noise")
	f.BoolVar(&pty, "pty", false, "serve each instrument as a serial port too, and name those in the rig file")
	return cmd
}

// writeNew writes a file that must not be there yet: it may be the drawer of a real bench.
func writeNew(path, text string) error {
	f, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o666)
	if errors.Is(err, os.ErrExist) {
		return fmt.Errorf("%s is there already: name another", path)
	}
	if err != nil {
		return err
	}
	_, err = f.WriteString(text)
	return errors.Join(err, f.Close())
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
