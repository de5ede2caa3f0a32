/** What the bench remembers between visits: run length and method of each seam, and who works tonight. */
import * as z from 'zod/mini';
import { loadDraft, saveDraft } from '$lib/device/read';
import type { DeviceStore } from '$lib/device/store';
import { METHODS } from '$lib/logbook/kinds';
import { RUN_LENGTHS } from './run';

/** What an older or newer app saved is taken as far as it is understood. */
const SeamMemory = z.object({
	length: z.optional(z.catch(z.optional(z.literal([...RUN_LENGTHS])), undefined)),
	method: z.optional(z.catch(z.optional(z.enum(METHODS)), undefined)),
	zoom: z.optional(z.catch(z.optional(z.number()), undefined))
});
export type SeamMemory = z.output<typeof SeamMemory>;

const Crew = z.object({ shooter: z.optional(z.string()), bucker: z.optional(z.string()) });
export type CrewMemory = z.output<typeof Crew>;

const seamKey = (build: string, seam: string) => `bench:${build}:${seam}`;
const crewKey = (build: string) => `bench:${build}`;

export async function recallSeam(
	store: DeviceStore,
	build: string,
	seam: string
): Promise<SeamMemory> {
	const read = SeamMemory.safeParse(await loadDraft(store, seamKey(build, seam)));
	return read.success ? read.data : {};
}

export async function recallCrew(store: DeviceStore, build: string): Promise<CrewMemory> {
	const read = Crew.safeParse(await loadDraft(store, crewKey(build)));
	return read.success ? read.data : {};
}

export function keepSeam(
	store: DeviceStore,
	build: string,
	seam: string,
	memory: SeamMemory
): Promise<void> {
	return saveDraft(store, seamKey(build, seam), memory);
}

export function keepCrew(store: DeviceStore, build: string, memory: CrewMemory): Promise<void> {
	return saveDraft(store, crewKey(build), memory);
}
