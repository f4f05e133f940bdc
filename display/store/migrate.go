package store

import (
	"crypto/sha256"
	"database/sql"
	"encoding/hex"
	"fmt"
	"io/fs"
	"strings"
	"time"
)

// migrate brings the schema up to date: numbered files, each in one transaction, each remembered with
// its hash. A register that holds more than files, or other ones, is refused as it is.
func migrate(e engine, db *sql.DB, files fs.FS) error {
	fail := func(err error) error {
		if said := e.explain(err); said != nil {
			return fmt.Errorf("%s: %w", e.name(), said)
		}
		return fmt.Errorf("%s: %w; expected a register that can be written to", e.name(), err)
	}
	names, err := fs.Glob(files, "*.sql")
	if err != nil {
		return fail(err)
	}
	have, err := e.version(db)
	if err != nil {
		return fail(err)
	}
	if have > len(names) {
		return newer(e.name(), have, len(names))
	}
	for i, name := range names {
		text, err := fs.ReadFile(files, name)
		if err != nil {
			return fail(err)
		}
		hash := hashOf(text)
		if i < have {
			var was string
			if err := db.QueryRow("SELECT sha256 FROM migrations WHERE number = $1", i+1).Scan(&was); err != nil {
				return fail(err)
			}
			if was != hash {
				return fmt.Errorf("%s: %w of this program: its schema %d is another; expected that of a release; use the program that made it", e.name(), ErrForeign, i+1)
			}
			continue
		}
		if err := apply(e, db, i+1, string(text), hash); err != nil {
			return fail(err)
		}
	}
	return nil
}

func newer(name string, have, known int) error {
	return fmt.Errorf("%s: %w (schema %d, known %d); expected an older one; use the newer program", name, ErrNewer, have, known)
}

func apply(e engine, db *sql.DB, number int, text, hash string) (err error) {
	tx, err := db.Begin()
	if err != nil {
		return err
	}
	defer func() {
		if err != nil {
			_ = tx.Rollback()
		}
	}()
	if _, err = tx.Exec("CREATE TABLE IF NOT EXISTS migrations (number INTEGER PRIMARY KEY, sha256 TEXT NOT NULL, time TEXT NOT NULL)"); err != nil {
		return err
	}
	if _, err = tx.Exec(text); err != nil {
		return fmt.Errorf("schema %d: %w", number, err)
	}
	if _, err = tx.Exec("INSERT INTO migrations (number, sha256, time) VALUES ($1, $2, $3)", number, hash, instant(time.Now())); err != nil {
		return err
	}
	if err = e.mark(tx, number); err != nil {
		return err
	}
	if err = tx.Commit(); err != nil {
		return err
	}
	return e.settle(db)
}

// hashOf is the same whatever line ends a checkout has put into the file.
func hashOf(text []byte) string {
	sum := sha256.Sum256([]byte(strings.ReplaceAll(string(text), "\r\n", "\n")))
	return hex.EncodeToString(sum[:])
}
