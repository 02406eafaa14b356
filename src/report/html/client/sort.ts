/** Makes the tables marked sortable sort by their heads: by number where the cells carry one, else by text. */
export function sortTables(): void {
  for (const table of document.querySelectorAll<HTMLTableElement>('table.sortable')) {
    const heads = [...table.querySelectorAll('thead th')];
    heads.forEach((head, column) => {
      head.querySelector('button')?.addEventListener('click', () => sortBy(table, heads, column));
    });
  }
}

function sortBy(table: HTMLTableElement, heads: readonly Element[], column: number): void {
  const body = table.tBodies[0];
  const rows = [...body.rows];
  const numbers = rows.some((row) => row.cells[column].dataset.by !== undefined);
  // numbers begin with the largest, names with the first
  const first = numbers ? 'descending' : 'ascending';
  const last = numbers ? 'ascending' : 'descending';
  const order = heads[column].getAttribute('aria-sort') === first ? last : first;
  const sign = order === 'ascending' ? 1 : -1;
  const value = (row: HTMLTableRowElement): number => {
    const by = row.cells[column].dataset.by;
    return by === undefined || by === '' ? Number.NaN : Number(by);
  };
  const text = (row: HTMLTableRowElement): string => row.cells[column].textContent ?? '';
  rows.sort((a, b) => {
    if (!numbers) return sign * text(a).localeCompare(text(b), 'en', { numeric: true });
    const [x, y] = [value(a), value(b)];
    // what has no figure stays below, whatever the direction
    if (Number.isNaN(x) || Number.isNaN(y)) return Number(Number.isNaN(x)) - Number(Number.isNaN(y));
    return sign * (x - y);
  });
  body.append(...rows);
  for (const head of heads) head.removeAttribute('aria-sort');
  heads[column].setAttribute('aria-sort', order);
  const said = document.getElementById('sorted');
  const name = heads[column].querySelector('button')?.firstChild?.textContent ?? '';
  if (said !== null) said.textContent = `sorted by ${name}, ${order}`;
}
