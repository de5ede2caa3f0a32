/** Reading what was typed into a form, field by field, with the reasons in words. */
import type { Length } from '$lib/logbook/kinds';
import { parseLength } from '$lib/rivet/length';
import { count } from './numbers';

/** By field: what is wrong and what would do. */
export type Errors = Readonly<Record<string, string>>;

/** Reads fields one by one and keeps what is wrong with them. */
export class FormReader {
	readonly errors: Record<string, string> = {};
	readonly #units: 'in' | 'mm';

	/** @param units of a length typed without one */
	constructor(units: 'in' | 'mm' = 'in') {
		this.#units = units;
	}

	/** Notes what is wrong, once for a field. */
	refuse(field: string, says: string): void {
		this.errors[field] ??= says;
	}

	text(field: string, typed: string, most: number): string | undefined {
		const value = typed.trim();
		if (value.length > most)
			this.refuse(field, `This is ${value.length} characters; at most ${most} fit.`);
		return value === '' ? undefined : value;
	}

	required(field: string, typed: string, most: number, says: string): string | undefined {
		if (typed.trim() === '') this.refuse(field, says);
		return this.text(field, typed, most);
	}

	whole(
		field: string,
		typed: string,
		least: number,
		most: number,
		says: string
	): number | undefined {
		if (typed.trim() === '') this.refuse(field, says);
		return this.wholeOrNone(field, typed, least, most);
	}

	wholeOrNone(field: string, typed: string, least: number, most: number): number | undefined {
		const text = typed.trim();
		if (text === '') return undefined;
		const value = /^\d{1,10}$/.test(text) ? Number(text) : Number.NaN;
		if (value >= least && value <= most) return value;
		this.refuse(field, `Write a whole number from ${count(least)} to ${count(most)}.`);
		return undefined;
	}

	wholes(field: string, typed: string, least: number, most: number): number[] | undefined {
		const parts = typed.split(/[\s,;]+/).filter((part) => part !== '');
		if (parts.length === 0) return undefined;
		const values = parts.flatMap((part) => this.wholeOrNone(field, part, least, most) ?? []);
		return values.length === parts.length ? values : undefined;
	}

	length(field: string, typed: string): Length | undefined {
		if (typed.trim() === '') return undefined;
		const read = parseLength(typed, this.#units);
		if (read.ok) return read.length;
		this.refuse(field, read.says);
		return undefined;
	}
}
