export { fillNormals } from './normals';
