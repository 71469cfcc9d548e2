import { Color, LinearSRGBColorSpace } from 'three';

/** The page's colours as the scene uses them. Read from the theme's CSS variables, so that both are one. */
export interface Palette {
	ink: Color;
	mute: Color;
	ground: Color;
	/** Lines on the surface: dark in both themes, as the values between them are not. */
	line: Color;
	/** Surface without a value. */
	plain: Color;
	/** Surface where the value is zero. */
	zero: Color;
	/** Outward. */
	copper: Color;
	/** Inward. */
	verdigris: Color;
	/** Light from below and from above, as factors of the surface's colour. */
	shade: [low: number, high: number];
}

/** As written in the style sheet: shaders mix these as they are, without a change of colour space. */
const colour = (css: string) => new Color().setStyle(css.trim(), LinearSRGBColorSpace);

export function readPalette(element: Element): Palette {
	const style = getComputedStyle(element);
	const token = (name: string) => colour(style.getPropertyValue(name));
	const dark = style.colorScheme === 'dark';
	return {
		ink: token('--ink'),
		mute: token('--mute'),
		ground: token('--ground'),
		line: dark ? token('--ground') : token('--ink'),
		plain: colour(dark ? '#7d868b' : '#c9c2b4'),
		zero: colour(dark ? '#66757a' : '#f4eee2'),
		copper: colour(dark ? '#f29250' : '#b5480f'),
		verdigris: colour(dark ? '#4fd0ba' : '#0e7466'),
		shade: dark ? [0.42, 1.08] : [0.62, 1.04]
	};
}

/** The diverging scale as a CSS gradient over [-extent, extent], full colour at ±limit. */
export function scaleGradient(palette: Palette, limit: number, extent: number): string {
	const css = (c: Color) => `#${c.getHexString(LinearSRGBColorSpace)}`;
	const at = (x: number) => `${(50 * (1 + x / extent)).toFixed(2)}%`;
	const { verdigris, zero, copper } = palette;
	return `linear-gradient(90deg, ${css(verdigris)} ${at(-limit)}, ${css(zero)} 50%, ${css(copper)} ${at(limit)})`;
}
