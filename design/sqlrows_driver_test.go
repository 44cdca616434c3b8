package design

import (
	"context"
	"database/sql"
	"database/sql/driver"
	"errors"
	"io"
	"testing"
)

// A cannedResult is a query result for tests: a driver that needs no database.
// It is its own connector, connection, statement-free query and rows.
type cannedResult struct {
	names, types []string // types may be nil
	rows         [][]driver.Value
	failAt       int // the row, from 1, at which the driver fails; 0 = never
	next         int
	closed       bool
}

var errCanned = errors.New("connection lost")

func (c *cannedResult) Connect(context.Context) (driver.Conn, error) { return c, nil }
func (c *cannedResult) Driver() driver.Driver                        { return nil }
func (c *cannedResult) Prepare(string) (driver.Stmt, error)          { return nil, driver.ErrSkip }
func (c *cannedResult) Begin() (driver.Tx, error)                    { return nil, driver.ErrSkip }
func (c *cannedResult) Close() error                                 { return nil }

func (c *cannedResult) QueryContext(context.Context, string, []driver.NamedValue) (driver.Rows, error) {
	return (*cannedRows)(c), nil
}

type cannedRows cannedResult

func (r *cannedRows) Columns() []string { return r.names }

func (r *cannedRows) Close() error {
	r.closed = true
	return nil
}

func (r *cannedRows) Next(dest []driver.Value) error {
	if r.next == len(r.rows) {
		return io.EOF
	}
	r.next++
	if r.next == r.failAt {
		return errCanned
	}
	copy(dest, r.rows[r.next-1])
	return nil
}

func (r *cannedRows) ColumnTypeDatabaseTypeName(j int) string {
	if r.types == nil {
		return ""
	}
	return r.types[j]
}

// query runs the canned query; rows and database are closed after the test.
func (c *cannedResult) query(t *testing.T) *sql.Rows {
	t.Helper()
	db := sql.OpenDB(c)
	rows, err := db.Query("anything")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		rows.Close()
		db.Close()
	})
	return rows
}
