import type { CameraRig, ViewName } from './camera-rig';

const TURN = (5 * Math.PI) / 180;
const PAN_PX = 24;
const ZOOM = 1.15;

export const viewKeys: Record<string, ViewName> = {
	'1': '-x',
	'2': '+x',
	'3': '-y',
	'4': '+y',
	'5': '+z',
	'6': '-z',
	'0': 'corner'
};

/** Keys of the view while the picture has the focus. */
export function viewportKey(event: KeyboardEvent, rig: CameraRig) {
	if (event.ctrlKey || event.metaKey || event.altKey) return;
	const move = (right: number, down: number) =>
		event.shiftKey ? rig.pan(-right * PAN_PX, -down * PAN_PX) : rig.turn(-right * TURN, -down * TURN);
	const act: Record<string, () => void> = {
		ArrowLeft: () => move(-1, 0),
		ArrowRight: () => move(1, 0),
		ArrowUp: () => move(0, -1),
		ArrowDown: () => move(0, 1),
		'+': () => rig.zoom(ZOOM),
		'=': () => rig.zoom(ZOOM),
		'-': () => rig.zoom(1 / ZOOM)
	};
	if (!act[event.key]) return;
	event.preventDefault();
	act[event.key]();
}
