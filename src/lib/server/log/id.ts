import { idMaker } from '$lib/logbook/id';

/** A new id for a line or device of the server's own. */
export const newId = idMaker(Date.now, (bytes) => crypto.getRandomValues(bytes));

/** The server's clock as entries write it. */
export function wallTime(now = Date.now()): string {
	return new Date(now).toISOString().replace('Z', '+00:00');
}
