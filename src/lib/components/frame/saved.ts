/** Writing lines from a form: what went wrong, in words. */
import { appendEntries, type Draft } from '$lib/device/append';
import { DeviceError } from '$lib/device/errors';
import type { DeviceStore } from '$lib/device/store';
import { ownSentence } from '$lib/logbook/own-refusals';

/** Adds the lines; answers why nothing was saved, or undefined when they are on the device's disk. */
export async function write(
	store: DeviceStore,
	build: string,
	lines: readonly Draft[]
): Promise<string | undefined> {
	try {
		await appendEntries(store, build, lines);
		return undefined;
	} catch (error) {
		return error instanceof DeviceError ? error.message : ownSentence('device.store_lost');
	}
}
