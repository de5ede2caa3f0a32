/** What went wrong in a round, as a code and a sentence for people. */
import { sentence } from '$lib/logbook/refusals';
import { DeviceError } from './errors';
import { Refused, Unreachable } from './transport';

export interface Fault {
	readonly code: string;
	readonly says: string;
}

/** What only a device can find out about a server, beside the catalogue of refusals. */
const SAYS = {
	'server.unreachable':
		'The server cannot be reached. Your lines are on this device and go out when it can.',
	'server.no_answer':
		'Something other than the Tallybar server answered, as a Wi-Fi sign-in page does. Your lines are on this device and go out when the server answers.',
	'server.failing': 'The server reports a fault. Your lines are on this device; it is tried again.',
	'history.broken':
		'What the server sent does not fit its own chain. Nothing of it was taken; it is asked again. If this stays, tell whoever runs the server.',
	'device.trouble':
		'The log on this device could not be read just now. Nothing was lost; it is tried again.'
} as const;

/** The server's lines do not lead to the place it named: changed on the way, or at the server. */
export class BrokenHistory extends Error {
	override name = 'BrokenHistory';
}

export function faultOf(error: unknown): Fault {
	if (error instanceof Refused) return { code: error.code, says: sentence(error.code) };
	if (error instanceof DeviceError) return { code: error.code, says: error.message };
	const code = ownCode(error);
	if (typeof code === 'string') return { code, says: SAYS[code] };
	return code;
}

function ownCode(error: unknown): keyof typeof SAYS | Fault {
	if (error instanceof BrokenHistory) return 'history.broken';
	if (!(error instanceof Unreachable)) return 'device.trouble';
	switch (error.reason) {
		case 'network':
		case 'timeout':
			return 'server.unreachable';
		case 'answer':
			return 'server.no_answer';
		case 'server':
			return error.code === undefined
				? 'server.failing'
				: { code: error.code, says: sentence(error.code) };
	}
}
