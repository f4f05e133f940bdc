package store

import (
	"context"
	"database/sql"
	"io/fs"
)

// engine is all that the store knows of the database below it. Statements are written once, in the SQL
// that SQLite and PostgreSQL share, with $1 for parameters; what differs stands behind this wall, and
// the suite of tests runs over every engine.
type engine interface {
	// name is what errors call the register.
	name() string
	// open opens a handle for the one writer and one for readers. It refuses what is no register and
	// leaves it untouched.
	open() (write, read *sql.DB, err error)
	// migrations are the numbered files of the schema, in the engine's own words.
	migrations() fs.FS
	// version is how many migrations a register holds; 0 for an empty one.
	version(db *sql.DB) (int, error)
	// mark keeps the version in the transaction that reached it.
	mark(tx *sql.Tx, version int) error
	// settle is called after a migration, outside any transaction.
	settle(db *sql.DB) error
	// explain puts the usual errors of the engine in words; nil where it knows nothing better.
	explain(err error) error
	// copyTo writes a checked copy to a new file.
	copyTo(ctx context.Context, db *sql.DB, path string) error
	// warnings says what is unwise about the place of the register, a line each.
	warnings() []string
	// closed is called when both handles are closed.
	closed()
}
