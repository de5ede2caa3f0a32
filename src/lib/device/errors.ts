import { ownSentence, type OwnRefusalCode } from '$lib/logbook/own-refusals';

/** Something the device could not do. `code` is for programs, the message for people. */
export class DeviceError extends Error {
	override name = 'DeviceError';
	constructor(
		readonly code: OwnRefusalCode,
		options?: ErrorOptions & { detail?: string | undefined }
	) {
		super(ownSentence(code), options);
		this.detail = options?.detail;
	}
	readonly detail: string | undefined;
}

/** What IndexedDB says through the name of an error. */
export function nameOf(error: unknown): string {
	return error instanceof Error || error instanceof DOMException ? error.name : '';
}
