import { Mesh, Vector3 } from 'three';
import { GLTFLoader } from 'three/examples/jsm/loaders/GLTFLoader.js';
import { describe, expect, it } from 'vitest';
import { writeGlb } from '$lib/formats/glb-write';
import { pyramid } from './pyramid';

describe('glTF, read by the loader of three', () => {
	it('patches as primitives over common vertices, metres, y up', async () => {
		const surface = pyramid();
		const bytes = writeGlb(surface, {
			metresPerUnit: 0.001,
			title: 'Pyramid',
			colours: new Float32Array(15).fill(0.5)
		});
		expect(bytes.length % 4).toBe(0);
		const gltf = await new GLTFLoader().parseAsync(bytes.buffer as ArrayBuffer, '');
		gltf.scene.updateMatrixWorld(true);
		const meshes: Mesh[] = [];
		gltf.scene.traverse((node) => {
			if (node instanceof Mesh) meshes.push(node);
		});
		expect(meshes.map((mesh) => mesh.geometry.index!.count / 3)).toEqual([2, 4]);
		expect(meshes.flatMap((mesh) => [...mesh.geometry.index!.array])).toEqual([...surface.triangles]);
		expect([...meshes[0].geometry.attributes.position.array]).toEqual([...surface.positions]);
		expect(meshes[1].geometry.attributes.color.count).toBe(5);
		// The tip (1, 1, 1.5) mm, z up, is (1, 1.5, -1) mm, y up.
		const tip = new Vector3(1, 1, 1.5).applyMatrix4(meshes[0].matrixWorld);
		expect(tip.distanceTo(new Vector3(0.001, 0.0015, -0.001))).toBeLessThan(1e-9);
	});
});
