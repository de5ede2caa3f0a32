import pino from 'pino';
import type { Logger } from 'pino';
import { config } from './config';

let current: Logger | undefined;

/**
 * The log of this process: one JSON object per line on stdout. Never hand it a request, a body, a
 * query string or a session; name what happened and the ids.
 */
export function log(): Logger {
	return (current ??= pino(
		{
			level: config().logLevel,
			base: null,
			timestamp: pino.stdTimeFunctions.isoTime,
			formatters: { level: (label) => ({ level: label }) }
		},
		// Written at once: a line about a crash must not die with the process.
		pino.destination({ dest: 1, sync: true })
	));
}
