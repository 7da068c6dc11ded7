// Package deploy holds what the service is put into operation with: an image, a
// systemd unit, Kubernetes manifests, alert rules, licences and a list of components.
// It has no code but its tests and the program that writes that list.
package deploy
