package main

import (
	"strings"
)

// What help -json prints: the verbs, the usage of one, or the keys of a file.
type (
	helpForm struct {
		Format int        `json:"format"`
		Verbs  []verbForm `json:"verbs"`
		Topics []string   `json:"topics"`
	}
	verbForm struct {
		Name  string `json:"name"`
		Usage string `json:"usage"`
		Says  string `json:"says"`
	}
	topicForm struct {
		Format int       `json:"format"`
		Topic  string    `json:"topic"`
		Usage  string    `json:"usage,omitempty"`
		Text   string    `json:"text"`
		Keys   []keyForm `json:"keys,omitempty"`
	}
	keyForm struct {
		Path     string `json:"path"`
		Example  string `json:"example,omitempty"`
		Allowed  string `json:"allowed,omitempty"`
		Absent   string `json:"absent,omitempty"`
		Required bool   `json:"required"`
		Says     string `json:"says"`
	}
)

func (v verb) usage() string {
	return strings.Join(strings.Fields("holdfast "+v.name+" "+v.flags+" "+v.operands), " ")
}

func helpFormOf() helpForm {
	f := helpForm{Format: jsonFormat}
	for _, v := range verbs() {
		f.Verbs = append(f.Verbs, verbForm{v.name, v.usage(), v.short})
	}
	for _, h := range fileHelps() {
		f.Topics = append(f.Topics, h.topic)
	}
	return f
}

// topicFormOf tells of a topic that exists.
func topicFormOf(topic string) topicForm {
	f := topicForm{Format: jsonFormat, Topic: topic}
	for _, v := range verbs() {
		if v.name == topic {
			f.Usage, f.Text = v.usage(), verbHelp(topic)
		}
	}
	for _, h := range fileHelps() {
		if h.topic != topic {
			continue
		}
		f.Text = strings.TrimSpace(h.head + "\n\n" + h.foot)
		for _, k := range h.keys {
			v := keyForm{k.path, k.example, k.limits, k.absent, k.absent == must, k.says}
			if v.Required {
				v.Absent = ""
			}
			f.Keys = append(f.Keys, v)
		}
	}
	if topic == jsonTopic {
		f.Text = jsonHead
		for _, v := range jsonKeys() {
			for name := range strings.SplitSeq(v.verbs, ", ") {
				for _, k := range v.keys {
					f.Keys = append(f.Keys, keyForm{Path: name + "." + k.path, Says: k.says})
				}
			}
		}
	}
	return f
}
