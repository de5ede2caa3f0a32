import { hash } from 'node:crypto';
import type { Sha256 } from '$lib/logbook/bytes';

/** Node's own SHA-256 for the logbook. */
export const NODE_SHA256: Sha256 = {
	text: (text) => hash('sha256', text, 'base64url'),
	bytes: (bytes) => hash('sha256', bytes, 'buffer')
};
