package store_test

import (
	"context"
	"fmt"
	"log"
	"os"
	"path/filepath"
	"strings"
	"time"

	"ringbook/snubber"
	"ringbook/store"
)

// A trial is logged, another is imported, and the history is read back.
func Example() {
	dir, err := os.MkdirTemp("", "bench")
	if err != nil {
		log.Fatal(err)
	}
	defer os.RemoveAll(dir)
	ctx := context.Background()
	lb, err := store.Open(ctx, filepath.Join(dir, "ringbook.db"))
	if err != nil {
		log.Fatal(err)
	}
	defer lb.Close()

	id, err := lb.Add(ctx, snubber.Trial{
		Board: "Kestrel", Revision: "B", At: time.Date(2026, 3, 1, 9, 30, 0, 0, time.UTC),
		Network:  snubber.Network{Kind: snubber.Bare},
		Readings: []snubber.Reading{{Quantity: snubber.RingHz, Value: 38.7e6, U: 0.1e6}},
	})
	if err != nil {
		log.Fatal(err)
	}
	sheet := strings.NewReader("board,revision,network,c,ring_hz,ring_hz_u,at\n" +
		"Kestrel,B,c,470p,19.7 MHz,0.1M,2026-03-01T09:40:00Z\n" +
		"Kestrel,B,c,1n,14.6 MHz,0.1M,2026-03-01T09:50:00Z\n")
	if _, err := lb.AddAll(ctx, store.ReadCSV(sheet), nil); err != nil {
		log.Fatal(err)
	}
	if err := lb.Strike(ctx, store.ShortID(id), "probe was on its 1x setting"); err != nil {
		log.Fatal(err)
	}
	for t, err := range lb.Trials(ctx, store.Scope{Board: "Kestrel", IncludeStruck: true}) {
		if err != nil {
			log.Fatal(err)
		}
		ring, _ := t.Reading(snubber.RingHz)
		fmt.Printf("%s %-4s %4.0f pF  %.1f MHz\n", t.At.Format("15:04"), t.Network.Kind, t.Network.C*1e12, ring.Value/1e6)
		if t.Struck != "" {
			fmt.Println("      struck:", t.Struck)
		}
	}
	// Output:
	// 09:30 bare    0 pF  38.7 MHz
	//       struck: probe was on its 1x setting
	// 09:40 c     470 pF  19.7 MHz
	// 09:50 c    1000 pF  14.6 MHz
}
