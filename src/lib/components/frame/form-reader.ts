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

	refuse(field: string, says: string): undefined {
		this.errors[field] ??= says;
	}

	text(field: string, typed: string, most: number): string | undefined {
		const value = typed.trim();
		if (value === '') return undefined;
		return value.length > most
			? this.refuse(field, `This is ${value.length} characters; at most ${most} fit.`)
			: value;
	}

	required(field: string, typed: string, most: number, says: string): string | undefined {
		return typed.trim() === '' ? this.refuse(field, says) : this.text(field, typed, most);
	}

	whole(
		field: string,
		typed: string,
		least: number,
		most: number,
		says: string
	): number | undefined {
		return typed.trim() === ''
			? this.refuse(field, says)
			: this.wholeOrNone(field, typed, least, most);
	}

	wholeOrNone(field: string, typed: string, least: number, most: number): number | undefined {
		const text = typed.trim();
		if (text === '') return undefined;
		const value = /^\d{1,10}$/.test(text) ? Number(text) : Number.NaN;
		return value >= least && value <= most
			? value
			: this.refuse(field, `Write a whole number from ${count(least)} to ${count(most)}.`);
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
		return read.ok ? read.length : this.refuse(field, read.says);
	}
}
