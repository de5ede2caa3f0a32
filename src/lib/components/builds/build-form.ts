/** Between what is typed about a build and the lines it becomes. Pure. */
import * as z from 'zod/mini';
import type { Build } from '$lib/logbook/fold/build';
import type { Body } from '$lib/logbook/kinds';
import { FormReader, type Errors } from '../frame/form-reader';

const typedText = z.string().check(z.maxLength(4000));
export const BuildTyped = z.object({
	name: typedText,
	about: typedText,
	place: typedText,
	units: typedText
});
/** The form as text, nothing read yet. */
export type BuildTyped = z.output<typeof BuildTyped>;

/** What is kept of a change that is not saved yet. */
export const BuildDraft = z.object({
	typed: BuildTyped,
	opened: z.optional(
		z.object({ typed: BuildTyped, heads: z.record(z.string(), z.array(z.string())) })
	)
});

export const EMPTY_BUILD: BuildTyped = { name: '', about: '', place: '', units: 'in' };

export type BuildRead =
	| { readonly ok: true; readonly body: Body<'build.opened'> }
	| { readonly ok: false; readonly errors: Errors };

export function readBuild(typed: BuildTyped): BuildRead {
	const read = new FormReader();
	const name = read.required(
		'name',
		typed.name,
		80,
		'Give it the name painted on it, or any you use.'
	);
	const about = read.text('about', typed.about, 400);
	const place = read.text('place', typed.place, 80);
	if (name === undefined || Object.keys(read.errors).length > 0)
		return { ok: false, errors: read.errors };
	return {
		ok: true,
		body: {
			name,
			units: typed.units === 'mm' ? 'mm' : 'in',
			...(about !== undefined && { about }),
			...(place !== undefined && { place })
		}
	};
}

/** A build as text, the way it would have been typed. */
export function typedBuild({ fields, units }: Pick<Build, 'fields' | 'units'>): BuildTyped {
	const text = (name: string) => (fields.get(name)?.value as string | undefined) ?? '';
	return { name: text('name'), about: text('about'), place: text('place'), units };
}
