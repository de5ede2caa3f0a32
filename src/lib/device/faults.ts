/** What went wrong in a round, as a code and a sentence for people. */
import { sentence, type RefusalCode } from '$lib/logbook/refusals';
import { DeviceError } from './errors';
import { Refused, Unreachable } from './transport';

export interface Fault {
	readonly code: string;
	readonly says: string;
}

/** The server's lines do not lead to the place it named: changed on the way, or at the server. */
export class BrokenHistory extends Error {
	override name = 'BrokenHistory';
}

export function faultOf(error: unknown): Fault {
	if (error instanceof DeviceError) return { code: error.code, says: error.message };
	const code = codeOf(error);
	return { code, says: sentence(code) };
}

function codeOf(error: unknown): string {
	if (error instanceof Refused) return error.code;
	if (error instanceof BrokenHistory) return 'history.broken' satisfies RefusalCode;
	if (!(error instanceof Unreachable)) return 'device.trouble' satisfies RefusalCode;
	switch (error.reason) {
		case 'network':
		case 'timeout':
			return 'server.unreachable' satisfies RefusalCode;
		case 'answer':
			return 'server.no_answer' satisfies RefusalCode;
		case 'server':
			return error.code ?? ('server.failing' satisfies RefusalCode);
	}
}
