// Package deploy holds what the service is put into operation with: an image, a
// systemd unit, Kubernetes manifests and alert rules. It has no code but its tests.
package deploy
