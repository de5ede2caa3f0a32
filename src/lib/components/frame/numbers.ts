/** Numbers in words on a screen. */

const grouped = new Intl.NumberFormat('en-US');

/** `1,843` */
export function count(value: number): string {
	return grouped.format(value);
}

/** `1 hole`, `14 holes` */
export function counted(value: number, one: string, many = `${one}s`): string {
	return `${count(value)} ${value === 1 ? one : many}`;
}

/** `Ana`, `Ana and Jo`, `Ana, Jo and Max` */
export function listed(names: readonly string[]): string {
	if (names.length < 2) return names[0] ?? '';
	return `${names.slice(0, -1).join(', ')} and ${names.at(-1) ?? ''}`;
}
