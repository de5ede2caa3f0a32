/**
 * Rows of comma-separated text after RFC 4180: quoted fields may hold commas, line ends and doubled quotes. Only for
 * the plan that ships with the app.
 * @throws Error for a quote that is never closed, or text after a closing one
 */
export function readCsv(text: string): string[][] {
	const rows: string[][] = [];
	let row: string[] = [];
	// A field with what ends it: a comma, a line end or the end of the text.
	const field = /(?:"((?:[^"]|"")*)"|([^",\r\n]*))(,|\r?\n|$)/y;
	while (field.lastIndex < text.length || row.length > 0) {
		const at = field.lastIndex;
		const found = field.exec(text);
		if (!found) throw new Error(`character ${at}: a quoted field does not end here`);
		const [, quoted, plain = '', end] = found;
		row.push(quoted?.replaceAll('""', '"') ?? plain);
		if (end === ',') continue;
		rows.push(row);
		row = [];
	}
	return rows;
}
